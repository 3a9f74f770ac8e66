"""The guide: pages in plain HTML that the service itself serves, so that they can be read on a closed network.

Each page has worked examples: a question in ``<pre class="question" data-call="...">`` and part of its answer in the
``<pre class="answer">`` behind it. The tests ask the questions as they stand there. Plants and readings are invented.
"""

from gasapi.guide.examples import Example, examples_of
from gasapi.guide.guide import PAGES, Guide, Page

__all__ = ["PAGES", "Example", "Guide", "Page", "examples_of"]
