"""The web service: pages and a JSON interface over :mod:`cant.service`.

The application factory is :func:`webapp.app.create_app`; ``cant serve`` runs :func:`webapp.serve.run`.
"""
