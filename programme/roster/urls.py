app_name = "roster"
urlpatterns: list = []
