"""The lifecycle in one table: state, what happened, next state, reason.

| state            | what happened                              | next       | reason             |
|------------------|--------------------------------------------|------------|--------------------|
| —                | unpaired detection at or above birth score | tentative  | born               |
| tentative        | paired, M detections since birth           | confirmed  | hits reached       |
| tentative        | M out of reach within N frames             | ended      | hits out of reach  |
| tentative        | log-odds at or above Wald's upper threshold| confirmed  | evidence reached   |
| any              | log-odds at or below the lower one         | ended      | evidence gone      |
| tentative        | older than undecided_frames                | ended      | undecided          |
| confirmed        | not paired                                 | coasting   | missed             |
| coasting         | paired                                     | confirmed  | found again        |
| any              | last detection older than coast_seconds    | ended      | coast limit        |
| coasting         | exit_share of it out of view, or in an exit| ended      | left view          |

The two lines on hits hold with ``lifecycle.rule = "hits"``, the three on log-odds and age with
"evidence". Whatever is not in the table leaves the state as it is. The coasting limit and the
exits are looked at before a frame is associated, so a track never takes a detection later than its
limit allows; tentative tracks are under it too, which matters where frames are far apart.
"""

from __future__ import annotations

from enum import IntEnum

from tracker.kernels import lifecycle as kernel


class Reason(IntEnum):
    """Why a track changed state; the value is the code in arrays and kernels."""

    UNCHANGED = kernel.UNCHANGED
    BORN = kernel.BORN
    HITS_REACHED = kernel.HITS_REACHED
    MISSED = kernel.MISSED
    FOUND_AGAIN = kernel.FOUND_AGAIN
    HITS_OUT_OF_REACH = kernel.HITS_OUT_OF_REACH
    COAST_LIMIT = kernel.COAST_LIMIT
    EVIDENCE_REACHED = kernel.EVIDENCE_REACHED
    EVIDENCE_GONE = kernel.EVIDENCE_GONE
    UNDECIDED = kernel.UNDECIDED
    LEFT_VIEW = kernel.LEFT_VIEW

    @property
    def words(self) -> str:
        return self.name.lower().replace("_", " ")
