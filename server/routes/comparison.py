"""What lies between these two? /c/{collection}/{edition}/comparison and its twins."""

from server.pages import comparison
from server.results.questions import ComparisonQuestion
from server.results.sides import completed, headings
from server.routes.asking import pinned

router = pinned(ComparisonQuestion, comparison.build, complete=completed, beside=headings)
