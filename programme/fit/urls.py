app_name = "fit"
urlpatterns: list = []
