"""The audit, "which frame is this coordinate in?": frame, place, origin and time that explain numbers.

`audit` answers on one position, or several of one kind, against a body, a star or a point; `audit_each` on many at
once; `audit_unknown` finds the star, too; `fit_identified` and `fit_unidentified` date a whole table; `offsets` and
`position_angles` answer on images, offsets and rates.
"""

from colure.audit.answer import STATUSES, Audit, ask, audit, audit_each, audit_joint
from colure.audit.fits import Fit, fits
from colure.audit.hypotheses import Hypothesis, Predictions, plan, predict
from colure.audit.mending import Mending, mend
from colure.audit.numbers import Numbers, last_digit, read
from colure.audit.orientation import Turn, TurnPredictions, View, offsets, position_angles
from colure.audit.reference import Question, Stars
from colure.audit.residuals import Residual, from_claim
from colure.audit.search import Found, audit_unknown
from colure.audit.tablefile import date_table, half_digit_deg, moments, star_rows
from colure.audit.tablefit import SURE_COST, Model, TableFit, fit_identified, fit_unidentified
from colure.audit.verdict import BEYOND, WITHIN, Candidate, Judged, Separation, joint, judge, ranked

__all__ = [
    "BEYOND",
    "STATUSES",
    "SURE_COST",
    "WITHIN",
    "Audit",
    "Candidate",
    "Fit",
    "Found",
    "Hypothesis",
    "Judged",
    "Mending",
    "Model",
    "Numbers",
    "Predictions",
    "Question",
    "Residual",
    "Separation",
    "Stars",
    "TableFit",
    "Turn",
    "TurnPredictions",
    "View",
    "ask",
    "audit",
    "audit_each",
    "audit_joint",
    "audit_unknown",
    "date_table",
    "fit_identified",
    "fit_unidentified",
    "fits",
    "from_claim",
    "half_digit_deg",
    "joint",
    "judge",
    "last_digit",
    "mend",
    "moments",
    "offsets",
    "plan",
    "position_angles",
    "predict",
    "ranked",
    "read",
    "star_rows",
]
