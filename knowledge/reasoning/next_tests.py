"""What to do next, in bits: which untested sign, which better damage estimate, which scan would tell accounts apart.

For a test with outcomes o the expected information is ``H(accounts) - sum_o P(o) H(accounts | o)`` (Lindley 1956),
with ``H`` Shannon's entropy in bits of the posterior over accounts.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.reasoning.grouping import Grouping
from byway.knowledge.reasoning.posterior import SCENARIOS, Reckoning
from byway.knowledge.reasoning.scenarios import AXES

__all__ = ["AXIS_SCANS", "Outlook", "entropy_bits", "next_axes", "next_images", "outlook"]

AXIS_SCANS = {
    "dominance": "functional imaging of language, or another test of language dominance",
    "boundary": "another sequence, or a more careful drawing",
    "perilesional": "perfusion imaging, or a scan once oedema has gone",
    "remote": "perfusion or metabolic imaging of the regions that lost their input",
    "outside": "a search for a second cause: repeat the history, the whole-brain scan, the blood tests",
}
"""What could tell the values of an axis apart. Common practice, no source."""

WIDE = 0.15
"""Width of a 5-95 % interval of damage from which a better estimate is worth asking for."""


def entropy_bits(probabilities: NDArray[np.floating], axis: int = -1) -> NDArray[np.float64]:
    """Shannon entropy in bits; zeros count as nothing.

    >>> float(entropy_bits(np.array([0.5, 0.5])))
    1.0
    """
    p = np.asarray(probabilities, float)
    with np.errstate(divide="ignore", invalid="ignore"):
        terms = np.where(p > 0.0, -p * np.log2(p), 0.0)
    total: NDArray[np.float64] = terms.sum(axis=axis)
    return total


@dataclass(frozen=True, eq=False)
class Outlook:
    """What each untested sign would tell.

    Parameters
    ----------
    signs : tuple of str
        Sign ids, in the order of the arrays.
    p_found : (n_signs,) float
        Probability that the test finds the sign, in the light of the findings so far.
    if_present, if_absent : (n_signs, n_groups) float
        Posterior of the accounts after each outcome, in the order of the grouping.
    bits : (n_signs,) float
        Expected information.
    """

    grouping: Grouping
    signs: tuple[str, ...]
    p_found: NDArray[np.float64]
    if_present: NDArray[np.float64]
    if_absent: NDArray[np.float64]
    bits: NDArray[np.float64]

    def table(self, reckoning: Reckoning, titles: list[str]) -> pd.DataFrame:
        """Tests, most telling first.

        Parameters
        ----------
        titles : list of str
            Title of each account, in the order of the grouping.

        Returns
        -------
        DataFrame
            ``sign``, ``side``, ``name``, ``bits``, ``minutes``, ``bits_per_minute``, ``p_found``, ``if_present`` and
            ``if_absent`` (title of the account that would then lead), ``p_if_present``, ``p_if_absent`` (its
            posterior), ``flips`` (whether one outcome would change the first account).
        """
        graph = reckoning.prepared.graph
        rows = []
        for i in np.argsort(-self.bits, kind="stable"):
            key, _, side = self.signs[i].rpartition("@")
            sign = graph.signs[key]
            present, absent = int(self.if_present[i].argmax()), int(self.if_absent[i].argmax())
            rows.append((
                key, side, sign.name, float(self.bits[i]), float(sign.minutes), float(self.bits[i] / sign.minutes),
                float(self.p_found[i]), titles[present], titles[absent], float(self.if_present[i, present]),
                float(self.if_absent[i, absent]), bool(present != 0 or absent != 0),
            ))  # fmt: skip
        return pd.DataFrame(rows, columns=[
            "sign", "side", "name", "bits", "minutes", "bits_per_minute", "p_found", "if_present", "if_absent",
            "p_if_present", "p_if_absent", "flips",
        ])  # fmt: skip


def outlook(reckoning: Reckoning, grouping: Grouping) -> Outlook:
    """Expected information of every untested sign whose outcome the accounts do not agree on.

    Signs that depend on nothing damaged tell only a cause outside the lesion from the others; they are left out.
    """
    tested = {finding.sign_id for finding in reckoning.findings}
    signs = tuple(sign for sign in reckoning.affected_signs if sign not in tested)
    membership = grouping.membership()
    if not signs:
        nothing = np.zeros((0, len(grouping.groups)))
        return Outlook(grouping, (), np.zeros(0), nothing, nothing, np.zeros(0))
    lapse = reckoning.lapse
    found = np.empty((len(signs), len(SCENARIOS)))
    for i, sign in enumerate(signs):
        model = reckoning.model(0, sign)
        found[i] = (1.0 - lapse) * model.found(reckoning.expected_given_findings(sign)) + lapse * 0.5
    joint = (found * reckoning.posterior) @ membership.T  # (signs, groups): P(found and account)
    p_found = joint.sum(axis=1)
    present = joint / p_found[:, None]
    absent = (grouping.posterior - joint) / (1.0 - p_found)[:, None]
    bits = entropy_bits(grouping.posterior) - p_found * entropy_bits(present) - (1.0 - p_found) * entropy_bits(absent)
    return Outlook(grouping, signs, p_found, present, absent, np.maximum(bits, 0.0))


def next_images(reckoning: Reckoning, grouping: Grouping, *, bins: int = 4, most: int = 12) -> pd.DataFrame:
    """Damage estimates that are worth knowing better: elements with a wide interval, by expected information.

    The draws are parted into ``bins`` by the element's damage as drawn; each bin is one outcome of a better estimate.

    Returns
    -------
    DataFrame
        ``element``, ``name``, ``kind`` (region or segment), ``low``, ``high`` (5-95 % of damage), ``bits``, ``image``
        (what could give the estimate), ``flips`` (whether an outcome would change the first account).
    """
    prepared = reckoning.prepared
    drawn = reckoning.damage_of(SCENARIOS[0])
    low, high = np.quantile(drawn, [0.05, 0.95], axis=0)
    wide = np.flatnonzero(high - low >= WIDE)
    n_draws = drawn.shape[0]
    membership = grouping.membership()
    by_draw = reckoning.prior[:, None] * np.exp(reckoning.joint_logs - reckoning.joint_logs.max())
    account_draw = membership @ by_draw  # (groups, M)
    account_draw /= account_draw.sum()
    whole = entropy_bits(account_draw.sum(axis=1))
    rows = []
    for element in wide:
        ranks = np.argsort(np.argsort(drawn[:, element], kind="stable"), kind="stable")
        part = ranks * bins // n_draws
        joint = np.stack([account_draw[:, part == b].sum(axis=1) for b in range(bins)])
        outcome = joint.sum(axis=1)
        given = joint / np.maximum(outcome, 1e-300)[:, None]
        bits = max(0.0, float(whole - (outcome * entropy_bits(given)).sum()))
        name = prepared.element_ids[element]
        segment = not prepared.is_region[element]
        image = ("tractography of this person's bundle" if segment
                 else "another sequence, or a finer drawing of its edge")  # fmt: skip
        rows.append((name, prepared.graph.name_of(name), "segment" if segment else "region", float(low[element]),
                     float(high[element]), bits, image, bool((given.argmax(axis=1) != 0).any())))  # fmt: skip
    rows.sort(key=lambda row: (-row[5], row[0]))
    return pd.DataFrame(rows[:most],
                        columns=["element", "name", "kind", "low", "high", "bits", "image", "flips"])  # fmt: skip


def next_axes(reckoning: Reckoning, grouping: Grouping) -> pd.DataFrame:
    """What knowing one axis for certain would tell: ``axis``, ``values`` (posterior of each), ``bits``, ``image``."""
    membership = grouping.membership()
    rows = []
    for axis, image in AXIS_SCANS.items():
        values = AXES[axis]
        of_value = np.stack([[float(getattr(each, axis) == value) for each in SCENARIOS] for value in values])
        joint = (of_value * reckoning.posterior) @ membership.T  # (values, groups)
        outcome = joint.sum(axis=1)
        given = joint / outcome[:, None]
        bits = float(entropy_bits(joint.sum(axis=0)) - (outcome * entropy_bits(given)).sum())
        rows.append((axis, dict(zip(values, outcome.tolist(), strict=True)), max(0.0, bits), image))
    rows.sort(key=lambda row: -row[2])
    return pd.DataFrame(rows, columns=["axis", "values", "bits", "image"])
