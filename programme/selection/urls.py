app_name = "selection"
urlpatterns: list = []
