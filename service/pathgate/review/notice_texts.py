"""The texts of the rules whose findings are warnings and notes: the verdict stands, and something must be known."""

from __future__ import annotations

from pathgate.review.rule_text import RuleText

NOTICE_TEXTS = {
    "filter-depends-on-treatment": RuleText(
        "The treatment helped to choose the rows. The number may be right for them, but they are not the rows that"
        " there would be under another treatment.",
        "A report on what `late_delivery` does to `late_pickup` keeps parcels that were not `redirected`. If lateness"
        " gets parcels redirected, the report is silent on just those it hit hardest.",
        "Say in the report that the number holds for the rows kept. If it is to hold for all, drop the condition.",
    ),
    "lost-rows-depend-on-treatment": RuleText(
        "The treatment helped to decide which rows are there at all, so the number is about those that came through.",
        "A join with the table of `rated_drop_off` keeps parcels that were rated, and late parcels are rated more"
        " often: punctual ones come in only where the customer rates everything.",
        "Say in the report that the number holds for the rows that are there, or start from a table that holds"
        " every row.",
    ),
    "weighting-column-filtered": RuleText(
        "To speak of everybody, the rows kept are reweighted by a column to match everybody. For values of it of which"
        " the filter keeps no row, there is nothing to reweight.",
        "The filter keeps two districts, and the effect in the whole city is to come from weighting by `district`: of"
        " the other districts no parcel is in the data.",
        "Make sure that some rows of every value of the column are kept, or claim `population: kept`.",
    ),
    "covariate-recorded-after-treatment": RuleText(
        "What is recorded after the treatment may already carry what the treatment did, even where the graph draws no"
        " arrow. Adjusting for it would then hide part of the effect.",
        "A model of `late_delivery` adjusts for the `order_value` as billing holds it a week later, when late parcels"
        " have been partly written off.",
        "Use the value as it stood before the treatment. If you are sure that the treatment has no part in it, keep"
        " it; if it has, draw the arrow and review again.",
    ),
    "covariate-recorded-after-outcome": RuleText(
        "What is recorded after the outcome may be a consequence of it, and holding a consequence equal lets the"
        " outcome choose what is compared.",
        "A model of `refund` adjusts for a customer score that is computed at the end of the month, when refunds have"
        " gone into it.",
        "Use the value as it stood before the treatment. If you are sure that the outcome has no part in it, keep it;"
        " if it has, draw the arrow and review again.",
    ),
    "treatment-of-several-columns": RuleText(
        "Many combinations of the inputs give the same value, so raising the treatment by one can mean quite different"
        " actions with different effects.",
        "Risk computes a `risk_score` from `order_value` and `locker_full` and reads off what the score does to"
        " refunds: dearer goods and fuller lockers raise it alike and do not act alike.",
        "Make one of the inputs the treatment, or all of them, each with a coefficient of its own.",
    ),
    "coarse-covariate": RuleText(
        "Within one bucket the column still varies, and what varies still confounds. The verdict takes the bucket for"
        " the whole column, so it is kinder than the data may be.",
        "Pricing adjusts for `order_value > 50` and not for `order_value`: parcels worth 60 and 600 count as equal,"
        " though they differ in how they are handled and in how they are refunded.",
        "Adjust for the column itself, or make the buckets fine enough that the rest hardly matters.",
    ),
    "treatment-in-product": RuleText(
        "With the product in the model, the treatment's own coefficient is its effect only where the other column is"
        " zero or at its first level. That may be a group that hardly occurs.",
        "`refund ~ late_delivery * order_value` is fitted and the coefficient of `late_delivery` reported: it is the"
        " effect for parcels worth nothing, and there are none.",
        "Report the effect averaged over the rows, or the effect at values that you name. To get one number from one"
        " coefficient, leave the product out.",
    ),
    "redundant-covariate": RuleText(
        "The other covariates fix its value, so it adds no information. It can make the fit singular, and the"
        " coefficients of all that it depends on unreadable.",
        "A model adjusts for `order_value`, `discount` and `price_paid`, which is the one less the other.",
        "Take out the computed column, or what it is computed from.",
    ),
    "no-causal-path": RuleText(
        "By the graph the treatment cannot reach the outcome, so its effect is zero. Whatever number comes out is"
        " chance, bias, or a sign that the graph lacks an arrow.",
        "Somebody estimates what `repeat_order` does to `late_delivery`; the order came weeks after the delivery.",
        "Check whether the graph lacks an arrow and whether treatment and outcome were swapped. If neither, use the"
        " config as a test: a number far from zero speaks against the graph.",
    ),
    "no-arrow": RuleText(
        "The config asks for the direct effect, and the graph draws none, so it is zero. Whatever number comes out is"
        " chance, bias, or a sign that the graph lacks an arrow.",
        "The direct effect of `promotion` on `late_pickup` is asked for, and in the graph promotions delay pick-ups"
        " only by filling lockers.",
        "Say `asks: total` if you mean the whole effect; draw the arrow if you believe in one.",
    ),
    "outcome-precedes-treatment": RuleText(
        "In the graph the outcome brings about the treatment, so a link between the two is at least partly that.",
        "Billing takes `refund` for the treatment and `late_delivery` for the outcome, though money is paid back"
        " because the parcel was late.",
        "Check whether the two were swapped. If not, check which way the arrows of the graph point.",
    ),
    "treatment-precedes-treatment": RuleText(
        "With both in one model, the coefficient of the earlier one is its effect with the later one held fixed, which"
        " leaves out what it does through the later one.",
        "A model has `locker_full` and `late_delivery` as treatments: full lockers make parcels late, and that part of"
        " what they do is in the other coefficient.",
        "Read the earlier one's coefficient as what is left beside the later one. For its whole effect, write a config"
        " with it as the only treatment.",
    ),
    "missing-at-random-assumed": RuleText(
        "Dropping nulls is harmless only where what makes a value go missing has nothing to do with the rest. The"
        " review took that for granted, since nothing else was said.",
        "The filter `order_value > 20` also drops parcels without an `order_value`. If those are the ones that a"
        " struggling shop never declared, the rows kept are not what they seem.",
        "Find out why values are missing and say it under `missing_because`, with an empty list where nothing in the"
        " graph plays a part. The note then goes, or turns into a finding.",
    ),
    "join-selects-rows": RuleText(
        "A join drops rows without a partner, which is a filter that nobody wrote down. The review took it to be"
        " unrelated to everything in the graph.",
        "Parcels are joined to the table of tickets to get one more column, and every parcel without a ticket is"
        " gone.",
        "Say under `rows_exist_because` what decides whether there is a partner, or use an outer join.",
    ),
    "waiver-expired": RuleText(
        "After its last day a waiver accepts nothing, so what it covered counts again.",
        "The routing team accepted a missing `weather` column until the end of the quarter, when the forecasts were to"
        " be loaded; the quarter is over.",
        "Mend what was accepted, or look at it again and set a new `until` with a reason that holds today.",
    ),
    "waiver-without-reason": RuleText(
        "A reader of the report has to see why somebody accepted a finding. Without a reason it is not accepted.",
        "A waiver for `missing-covariate` names an owner and a day, and nobody remembers what it was for.",
        "Write the reason into `why`, or take the waiver out.",
    ),
    "waiver-unused": RuleText(
        "A waiver that meets no finding does nothing today and may hide a new finding tomorrow.",
        "The condition on tickets went from the filter in spring; its waiver is still in the config and would accept"
        " the next condition on tickets unseen.",
        "Take it out. If it was meant for something else, check its rule and columns for misspellings.",
    ),
    "waiver-not-allowed": RuleText(
        "Where nothing is left to compare, or a column does not exist, no number can mean anything, and there is"
        " nothing that a team could accept.",
        "A waiver names `treatment-fixed`: only late parcels are in the data, and no reason adds punctual ones.",
        "Take the waiver out and mend what the finding is about.",
    ),
    "kept-rows-only": RuleText(
        "Who is kept tells of the outcome, so the effect in everybody may be another one. The verdict is about the rows"
        " kept.",
        "Among parcels of one promotion the effect of `late_delivery` on `repeat_order` is estimated soundly; a reader"
        " takes it for that among all parcels.",
        "Say with the number which rows it is about. To claim it for everybody, say `population: whole` and let the"
        " review tell what that takes.",
    ),
    "outside-graph": RuleText(
        "Of a name outside the graph nothing is known. The verdict holds only if the column has nothing to do with"
        " treatment and outcome.",
        "The filter reads `ds`, the day on which the row was loaded, and the config declares that under"
        " `outside_graph`. If late parcels are loaded later, it does matter.",
        "If the column may matter, put it into the graph with its arrows and take it off `outside_graph`.",
    ),
    "rows-are-groups": RuleText(
        "After a GROUP BY one row stands for many. A cause among single rows need not be one among groups.",
        "The query groups parcels by locker: the share of late ones is set against the refunds of a locker, while the"
        " graph says what happens to one parcel.",
        "Fit the model on the single rows, or draw a graph of the groups and review against that.",
    ),
}
