"""The page for people: a sheet on which one gas stands, and the papers beside it. It asks the service as any client does.

``templates/`` holds the HTML, made once at the start except for the catalogue; ``assets/`` what the browser fetches. Nothing
comes from elsewhere, nothing is built: the modules in ``assets/`` are served as they are written.
"""
