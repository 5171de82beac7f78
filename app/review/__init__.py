"""Plan + snapshot + past looks -> everything computed at one look."""

from app.review.as_used import as_used, as_used_of_record
from app.review.endpoints import review_look
from app.review.look import LookDeclared
from app.review.pooled import review_pooled

__all__ = ["LookDeclared", "as_used", "as_used_of_record", "review_look", "review_pooled"]
