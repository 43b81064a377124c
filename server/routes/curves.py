"""Which curve lies behind the death rates? /c/{collection}/{edition}/curves and its twins."""

from server.pages import curves
from server.results.questions import CurvesQuestion
from server.routes.asking import pinned

router = pinned(CurvesQuestion, curves.build)
