"""Random batches against the same cases one by one, and their laws."""

from __future__ import annotations

import warnings
from dataclasses import replace

import numpy as np
import pytest

import solver
from tests.fuzz.batches import SAME_AMOUNT, Batch, differences, random_batch

SEEDS = (2, 4, 5, 7, 9, 12)


def settled(batch: Batch) -> solver.EndStates:
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        return batch.settle()


@pytest.mark.parametrize("seed", SEEDS)
def test_batch_equals_its_cases(seed):
    batch = random_batch(seed, 16)
    ends = settled(batch)
    assert differences(batch, ends) == []
    assert not any("proof" in why for why in ends.why.values())


@pytest.mark.parametrize("seed", SEEDS[:3])
def test_order_and_scale_do_not_matter(seed):
    batch = random_batch(seed, 16)
    ends = settled(batch)
    order = np.random.default_rng(seed).permutation(len(batch))
    total = ends.amounts.sum(axis=1, keepdims=True)
    other = settled(batch.of(order))
    assert (other.settled == ends.settled[order]).all()
    assert np.nanmax(np.abs(other.amounts - ends.amounts[order]) / total[order]) < SAME_AMOUNT
    other = settled(batch.scaled(3.7e4))
    assert (other.settled == ends.settled).all()
    assert np.nanmax(np.abs(other.amounts / 3.7e4 - ends.amounts) / total) < SAME_AMOUNT


@pytest.mark.parametrize("seed", SEEDS[:3])
def test_impossible_cases_harm_no_other(seed):
    batch = random_batch(seed, 16)
    ends = settled(batch)
    X, Y = batch.X.copy(), batch.Y.copy()
    feeds = {sp: amounts.copy() for sp, amounts in batch.feeds.items()}
    first = next(iter(feeds))
    X[1], Y[5], feeds[first][9] = np.nan, -1.0, -2.0
    for amounts in feeds.values():
        amounts[12] = 0.0
    feeds[first][14] = np.nan
    X[15] = np.inf
    other = settled(replace(batch, feeds=feeds, X=X, Y=Y))
    bad = [1, 5, 9, 12, 14, 15]
    assert not other.settled[bad].any()
    assert set(bad) <= set(other.why)
    assert np.isnan(other.amounts[bad]).all()
    rest = np.setdiff1d(np.arange(16), bad)
    assert (other.settled[rest] == ends.settled[rest]).all()
    total = ends.amounts[rest].sum(axis=1, keepdims=True)
    off = np.abs(other.amounts[rest] - ends.amounts[rest]) / total
    assert np.nanmax(off, initial=0.0) < SAME_AMOUNT
