"""The per-frame loop: predict, associate, update, lifecycle — one call a stage, in order.

Offline runs, live runs, tuning and tests all use this one loop.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tracker.association import TierDecision, associate
from tracker.association.detectability import Detectability
from tracker.association.marginals import Marginals, mixture, tier_marginals
from tracker.association.rule import association_rules
from tracker.errors import InputError, UsageError
from tracker.kernels.cost import blend_embeddings
from tracker.kernels.lifecycle import (
    ENDED,
    advance,
    advance_by_evidence,
    expire,
    gather_evidence,
    take_over,
    weigh,
)
from tracker.kernels.snapshot import measured_part
from tracker.lifecycle.evidence import evidence_test
from tracker.lifecycle.exits import exits_of
from tracker.lifecycle.rules import Reason
from tracker.lifecycle.table import TrackTable
from tracker.log.model import Codes, Floats, Frame, Ints, Kind, SequenceFacts
from tracker.motion import motion_model
from tracker.motion.camera import CameraMotion, CameraStep
from tracker.results.tracks import TrackState
from tracker.settings import Settings


@dataclass(slots=True, eq=False)
class Transitions:
    """State changes of one frame, in order: (k,) arrays."""

    track: Ints
    before: NDArray[np.int8]  # TrackState, -1 for a birth
    after: NDArray[np.int8]  # TrackState
    reason: NDArray[np.int8]  # tracker.lifecycle.rules.Reason


@dataclass(slots=True, eq=False)
class Prediction:
    """What the engine expected and saw when it associated a frame; rows as in `considered`.

    estimate : (k, d) predicted measurement, covariance : (k, d, d) of it without measurement
    noise.   state : (k,) lifecycle state before the frame.   unseen : (k,) seconds since the
    last detection.   detected : (k,) P_D of each.   variance : (m, d) measurement variances of the
    detections.
    """

    estimate: Floats
    covariance: Floats
    state: NDArray[np.int8]
    unseen: Floats
    detected: Floats
    variance: Floats


@dataclass(slots=True, eq=False)
class FrameResult:
    """The live tracks after one frame, and how they came about. All arrays are copies.

    track, state, score, label : (n,).   detection : (n,) paired detection, -1 for none.
    estimate : (n, d) in measurement space (`tracker.log.model`), rate : (n, d) its velocity
    per second, covariance : (n, d, d) of the estimate.
    confidence : (n,) identity confidence, None if the engine does not explain.
    tiers : what each tier decided; its `track` indexes `considered`.
    considered : (k,) ids of the tracks that were live when the frame was associated.
    prediction : None if the engine does not explain.
    marginals : in joint-probabilistic mode each tier's probabilities, else nothing.
    camera : what the camera did before this frame, None if that is not looked for or not known.
    """

    number: int
    time: float
    track: Ints
    state: NDArray[np.int8]
    estimate: Floats
    rate: Floats
    covariance: Floats
    score: Floats
    label: Codes
    confidence: Floats | None
    detection: Ints
    transitions: Transitions
    tiers: tuple[TierDecision, ...]
    considered: Ints
    prediction: Prediction | None
    marginals: tuple[Marginals, ...]
    camera: CameraStep | None

    def __len__(self) -> int:
        return len(self.track)


class Engine:
    """A tracker that is fed one frame at a time.

    >>> engine = Engine(Settings(), Kind.POINT)
    >>> first = Frame.of_points(1, 0.0, [[2.0, 1.0]])
    >>> engine.step(first).track
    array([1])

    Parameters
    ----------
    settings : all settings.   kind : what is measured.   facts : of the sequence, for its image
    size and exit zones.
    explain : whether margins, identity confidence and predictions are kept (they cost a part of
    the association time; decisions are the same without).

    Raises SettingsError if the settings contradict the kind.
    """

    def __init__(
        self,
        settings: Settings | None = None,
        kind: Kind | str = Kind.BOX,
        *,
        facts: SequenceFacts | None = None,
        explain: bool = True,
    ) -> None:
        self.settings = settings or Settings()
        self.kind = Kind(kind)
        self.rules = association_rules(self.settings, self.kind)
        self.motion = motion_model(self.settings, self.kind)
        self.table = TrackTable(self.motion.states)
        moving = self.settings.camera.motion == "estimated" and self.kind is Kind.BOX
        self.camera = CameraMotion(self.settings.camera) if moving else None
        self.explain = explain
        self.now = -np.inf
        self._birth_score = self.settings.lifecycle.birth_score
        life = self.settings.lifecycle
        self._test = evidence_test(life) if life.rule == "evidence" else None
        self._exits = exits_of(facts, self.kind, life.exit_share)
        hidden = self.settings.sensor.hidden_below is not None
        self._hidden = Detectability(self.settings, self.kind) if hidden else None
        self._joint = self.settings.association.mode == "joint-probabilistic"
        # Weight of the past in the tracks' embeddings; None if no tier looks at appearance.
        self._memory = next(
            (rule.cost.appearance.memory for rule in self.rules if "appearance" in rule.terms),
            None,
        )

    def step(self, frame: Frame, camera: CameraStep | None = None) -> FrameResult:
        """Take one frame in; frames must come in order of time.

        camera : what the camera did since the frame before, where that is known from elsewhere
        (`tracker.motion.video`); None estimates it if the settings say so.

        Raises UsageError for a frame that is not later than the one before, InputError for a
        frame with too many candidates, CertificateError if an assignment is not proved optimal.
        """
        elapsed = self._elapse(frame)
        if self._memory is not None:
            self._meet_embeddings(frame)
        life = self.settings.lifecycle
        table = self.table

        # Tracks past their coasting limit end before they can take a detection.
        late, count = expire(table.last_seen, frame.time, life.coast_seconds)
        transitions = [self._end(late, Reason.COAST_LIMIT)] if count else []

        self.motion.predict(table.mean, table.covariance, elapsed)
        variance = self.motion.measurement_variance(frame.z, frame.sigma)
        if camera is not None:
            camera.apply(table, self.motion.coupled)
        elif self.camera is not None:
            camera = self.camera.follow(table, frame, variance, self.motion.coupled)
        if self._exits is not None:
            left = self._exits.left(table)
            if left is not None:
                transitions.append(self._end(left, Reason.LEFT_VIEW))
        detected = None if self._hidden is None else self._hidden.of(table)
        tiers, pairing = associate(
            self.rules, table, frame, variance, self.motion.coupled, self.explain, detected
        )
        considered = table.identity.copy()
        prediction = self._prediction(frame, variance, detected) if self.explain else None
        if self.explain:
            self._weigh(tiers)

        marginals: tuple[Marginals, ...] = ()
        if self._joint:
            marginals = self._correct_jointly(tiers, frame, variance)
        else:
            self.motion.update(table.mean, table.covariance, pairing, frame.z, variance)
        if self._memory is not None and frame.embedding is not None:
            blend_embeddings(table.embedding, pairing, frame.embedding, self._memory)
        paired = take_over(table.score, table.label, pairing, frame.score, frame.label)
        changed, before, reason, ended = self._advance(tiers, pairing, frame.time)
        if len(changed):
            after = table.state[changed]
            transitions.append(Transitions(considered[changed], before, after, reason))
        if ended:
            alive = table.state != ENDED
            table.keep(alive)
            pairing = pairing[alive]
        if paired < len(frame):
            born, pairing = self._give_birth(frame, variance, pairing)
            transitions += born
        return self._result(
            frame, pairing, transitions, tiers, considered, prediction, marginals, camera
        )

    def _elapse(self, frame: Frame) -> float:
        elapsed = frame.time - self.now
        if not elapsed > 0.0:
            raise UsageError(
                f"frame {frame.number} at {frame.time} s does not come after the frame before, "
                f"at {self.now} s; feed frames in order of time"
            )
        self.now = frame.time
        return elapsed if np.isfinite(elapsed) else 0.0

    def _meet_embeddings(self, frame: Frame) -> None:
        """Make sure that the frame's embeddings fit the tracks'."""
        if frame.embedding is None:
            raise InputError(
                "the cost term 'appearance' needs embeddings, and the log has none",
                remedy="Add embedding_0, embedding_1, … columns or take it out of cost.terms.",
            )
        length = frame.embedding.shape[1]
        if self.table.embedding.shape[1] == 0:
            self.table.hold_embeddings(length)
        elif self.table.embedding.shape[1] != length:
            raise InputError(
                f"frame {frame.number} has embeddings of {length} numbers, earlier ones had "
                f"{self.table.embedding.shape[1]}"
            )

    def _end(self, gone: NDArray[np.bool_], reason: Reason) -> Transitions:
        rows = np.flatnonzero(gone)
        table = self.table
        ended = Transitions(
            table.identity[rows],
            table.state[rows],
            np.full(len(rows), TrackState.ENDED, np.int8),
            np.full(len(rows), reason, np.int8),
        )
        if len(rows):
            table.keep(~gone)
        return ended

    def _prediction(self, frame: Frame, variance: Floats, detected: Floats | None) -> Prediction:
        table = self.table
        estimate, _, covariance = measured_part(table.mean, table.covariance, self.kind.dimension)
        unseen = frame.time - table.last_seen
        if detected is None:
            detected = np.full(len(table), self.settings.sensor.detection_probability)
        return Prediction(estimate, covariance, table.state.copy(), unseen, detected, variance)

    def _correct_jointly(
        self, tiers: tuple[TierDecision, ...], frame: Frame, variance: Floats
    ) -> tuple[Marginals, ...]:
        """Correct each track by all detections that might be its own, as probable as they are.

        That is all the mode changes: which detection a track is paired with, and so births,
        hits, lifecycle, ledger and proof, stays with the best assignment.
        """
        table, how = self.table, self.settings.association
        shares = tuple(tier_marginals(tier, how.exact_limit, how.ranked) for tier in tiers)
        alternatives = mixture(tiers, shares, len(table))
        self.motion.update_jointly(table.mean, table.covariance, alternatives, frame.z, variance)
        return shares

    def _weigh(self, tiers: tuple[TierDecision, ...]) -> None:
        for tier in tiers:
            weigh(self.table.log_confidence, tier.track, tier.solution.row_margin)

    def _advance(
        self, tiers: tuple[TierDecision, ...], pairing: Ints, now: float
    ) -> tuple[Ints, NDArray[np.int8], NDArray[np.int8], int]:
        """Every track's next state, by hits or by evidence."""
        table, life = self.table, self.settings.lifecycle
        columns = (table.state, table.hits, table.age, table.last_seen, table.log_confidence)
        if self._test is None:
            return advance(*columns, pairing, now, life.confirm_hits, life.confirm_window)
        for tier in tiers:
            problem, answer = tier.problem, tier.solution.answer
            gather_evidence(
                table.evidence, tier.track, answer.row_candidate, problem.cost, problem.miss
            )
        return advance_by_evidence(
            *columns,
            table.evidence,
            pairing,
            now,
            self._test.confirm_at,
            self._test.drop_at,
            life.undecided_frames,
        )

    def _give_birth(
        self, frame: Frame, variance: Floats, pairing: Ints
    ) -> tuple[list[Transitions], Ints]:
        """Unpaired detections that are scored high enough become tentative tracks."""
        free = np.ones(len(frame), np.bool_)
        free[pairing[pairing >= 0]] = False
        if self._birth_score is not None:
            free &= ~(frame.score < self._birth_score)  # a missing score does not stand in the way
        chosen = np.flatnonzero(free)
        if not len(chosen):
            return [], pairing
        table = self.table
        mean, covariance = self.motion.initiate(frame.z[chosen], variance[chosen])
        identity = table.append(
            mean,
            covariance,
            frame.score[chosen],
            frame.label[chosen],
            frame.time,
            0.0 if self._test is None else self._test.start,
        )
        if frame.embedding is not None and self._memory is not None:
            # A new track's mean is the unit vector of its only detection.
            blend_embeddings(table.embedding[-len(chosen) :], chosen, frame.embedding, 0.0)
        count = len(chosen)
        events = [
            Transitions(
                identity,
                np.full(count, -1, np.int8),
                np.full(count, TrackState.TENTATIVE, np.int8),
                np.full(count, Reason.BORN, np.int8),
            )
        ]
        if self._test is None and self.settings.lifecycle.confirm_hits == 1:
            table.state[-count:] = TrackState.CONFIRMED
            events.append(
                Transitions(
                    identity,
                    np.full(count, TrackState.TENTATIVE, np.int8),
                    np.full(count, TrackState.CONFIRMED, np.int8),
                    np.full(count, Reason.HITS_REACHED, np.int8),
                )
            )
        return events, np.concatenate((pairing, chosen))

    def _result(
        self,
        frame: Frame,
        pairing: Ints,
        transitions: list[Transitions],
        tiers: tuple[TierDecision, ...],
        considered: Ints,
        prediction: Prediction | None,
        marginals: tuple[Marginals, ...],
        camera: CameraStep | None,
    ) -> FrameResult:
        table = self.table
        estimate, rate, covariance = measured_part(
            table.mean, table.covariance, self.kind.dimension
        )
        return FrameResult(
            number=frame.number,
            time=frame.time,
            track=table.identity.copy(),
            state=table.state.copy(),
            estimate=estimate,
            rate=rate,
            covariance=covariance,
            score=table.score.copy(),
            label=table.label.copy(),
            confidence=np.exp(table.log_confidence) if self.explain else None,
            detection=pairing,
            transitions=_joined(transitions),
            tiers=tiers,
            considered=considered,
            prediction=prediction,
            marginals=marginals,
            camera=camera,
        )


NO_TRANSITIONS = Transitions(
    np.empty(0, np.int64), np.empty(0, np.int8), np.empty(0, np.int8), np.empty(0, np.int8)
)


def _joined(parts: list[Transitions]) -> Transitions:
    if not parts:
        return NO_TRANSITIONS
    if len(parts) == 1:
        return parts[0]
    return Transitions(
        np.concatenate([part.track for part in parts]),
        np.concatenate([part.before for part in parts]),
        np.concatenate([part.after for part in parts]),
        np.concatenate([part.reason for part in parts]),
    )
