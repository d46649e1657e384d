"""Studies: many cases of one design, planned, solved by many workers, kept, tabulated."""

from femag.study.plan import Case, Factor, Plan
from femag.study.run import Progress
from femag.study.sampling import Sample
from femag.study.store import Store
from femag.study.study import Study
from femag.study.study_file import read_study
from femag.study.table import StudyTable, read_table, table_of

__all__ = [
    "Case",
    "Factor",
    "Plan",
    "Progress",
    "Sample",
    "Store",
    "Study",
    "StudyTable",
    "read_study",
    "read_table",
    "table_of",
]
