app_name = "equipment"
urlpatterns: list = []
