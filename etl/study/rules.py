"""The rules that look at several keys of the study file; none reads a file.

A rule is left out where a key it reads is wrong in itself, and run otherwise: so a slip in one
table hides nothing in another, and no rule complains of a key whose own mistake is reported
already.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator

from etl.study import (
    bids_rules,
    log_rules,
    output_rules,
    place_rules,
    sample_rules,
    screening_rules,
    trial_rules,
)
from etl.study.event_rules import EVENT_RULES
from etl.study.models import StudyFile
from etl.study.positions import KeyPath
from etl.study.rule import Problem

RULES = (
    log_rules.reader_is_named,
    log_rules.trial_is_named,
    log_rules.order_is_known,
    log_rules.duration_is_known_once,
    log_rules.end_has_its_onset,
    log_rules.measured_columns_differ,
    log_rules.delimiter_is_no_decimal_sign,
    log_rules.events_have_lines,
    *EVENT_RULES,
    log_rules.bids_has_its_kind,
    bids_rules.bids_trials_have_a_column,
    bids_rules.bids_has_its_columns,
    bids_rules.bids_is_written_in_one_way,
    bids_rules.bids_has_its_eyes,
    log_rules.eye_is_known,
    log_rules.eyes_have_the_same_columns,
    sample_rules.samples_have_time_and_place,
    sample_rules.samples_are_no_fixations,
    sample_rules.events_have_no_samples,
    sample_rules.method_reads_its_own_keys,
    sample_rules.dispersion_has_its_limits,
    place_rules.place_is_known,
    place_rules.positions_share_a_unit,
    place_rules.degrees_have_a_screen,
    place_rules.degrees_have_a_width,
    place_rules.degrees_have_a_distance,
    place_rules.degrees_count_from_the_centre,
    place_rules.axis_fits_the_origin,
    place_rules.layout_goes_with_text,
    place_rules.lines_have_a_height,
    place_rules.line_method_reads_its_own_keys,
    place_rules.text_is_read_by_lines,
    place_rules.labels_have_no_geometry,
    trial_rules.keys_have_a_table,
    trial_rules.levels_belong_to_factors,
    trial_rules.factors_are_no_covariates,
    trial_rules.facts_keep_their_own_names,
    output_rules.contrasts_belong_to_factors,
    output_rules.contrasts_have_levels_in_order,
    output_rules.given_numbers_fit_their_levels,
    output_rules.centred_facts_are_covariates,
    screening_rules.text_time_has_limits,
    screening_rules.text_time_has_onsets,
    screening_rules.off_screen_has_a_screen,
    screening_rules.off_screen_has_positions,
    screening_rules.blink_has_its_column,
    screening_rules.undersweep_has_lines,
    screening_rules.merge_has_one_distance,
    screening_rules.merge_has_positions,
    screening_rules.merge_in_degrees_has_a_screen,
    screening_rules.merge_in_degrees_has_a_width,
    screening_rules.merge_in_degrees_has_a_distance,
    screening_rules.merge_in_characters_has_a_layout,
    screening_rules.some_duration_is_kept,
    screening_rules.some_trial_is_kept,
    screening_rules.confidence_has_lines,
    screening_rules.confidence_has_its_method,
    screening_rules.first_pass_blink_has_its_column,
    screening_rules.duration_of_trial_has_onsets,
    screening_rules.wrong_answer_is_known,
    screening_rules.correct_share_is_known,
    screening_rules.cells_have_factors,
)


def broken_rules(
    study: StudyFile, wrong: Collection[KeyPath], questions: Collection[KeyPath] = ()
) -> Iterator[Problem]:
    """Run every rule whose keys are sound.

    Parameters
    ----------
    study : StudyFile
        The study, with defaults or examples in place of what is wrong.
    wrong : collection of tuple
        The keys that are wrong in themselves; a wrong table makes all its keys wrong.
    questions : collection of tuple
        The keys whose value is a question still open.

    Yields
    ------
    Problem
        What contradicts a rule, in the order of the rules.
    """
    for rule in RULES:
        if rule.applies(wrong) and not rule.awaits(questions):
            yield from rule.check(study)
