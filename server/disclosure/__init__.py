"""What of small counts is not shown: one mask an edition, and what stands in for the counts.

Pure: schedules and terms in, a mask out. Everything shown under `figures=released` is worked out
from counts that are shown and from stand-ins that are themselves worked out from these, so that no
figure, in any form and at any precision, can say more than the table of shown counts does. That
table is what `closing` protects.
"""
