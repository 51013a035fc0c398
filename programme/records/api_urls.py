app_name = "api"
urlpatterns: list = []
