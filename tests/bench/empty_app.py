"""The floor of a comparison: a Flask application that does nothing."""

from flask import Flask

app = Flask(__name__)


@app.get("/")
def nothing() -> str:
    return ""


@app.post("/v1/state")
def nothing_asked() -> str:
    return ""
