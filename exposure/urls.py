app_name = "exposure"
urlpatterns: list = []
