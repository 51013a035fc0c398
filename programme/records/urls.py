app_name = "records"
urlpatterns: list = []
