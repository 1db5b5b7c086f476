"""The texts of the rules whose findings are errors: with one of these the number is not the effect it is read as."""

from __future__ import annotations

from pathgate.review.rule_text import RuleText

ERROR_TEXTS = {
    "missing-covariate": RuleText(
        "Rows with different values of the treatment differ in that column too, and the model books its share of the"
        " outcome to the treatment.",
        "The routing team compares `late_pickup` of parcels with and without `late_delivery` and leaves out"
        " `weather`: rain delays couriers and keeps people at home, so lateness is blamed for what the rain did.",
        "Add the column that the finding names to `covariates`; `remedies` lists every smallest change that does. If"
        " you do not hold the column after all, mark it `measured: false` in the graph and review again.",
    ),
    "unmeasured-cause": RuleText(
        "Something that no table holds moves treatment and outcome together, and no column at hand can tell its"
        " share from that of the treatment.",
        "Support reads the effect of `rated_drop_off` on `refund`: people with a `complaint_habit`, which nobody"
        " records, both rate and ask for money back, so the rating seems to cause refunds that it does not.",
        "Apply one of the `remedies` if there are any. If there are none, `measure_next` names the cheapest thing to"
        " record; until it is recorded, report the number as a link between two columns and not as an effect.",
    ),
    "unblockable-path": RuleText(
        "A link that is not the effect reaches the number, and every column that could cut it is part of the effect or"
        " follows from it.",
        "Billing asks for the effect of `refund` on `late_delivery`: late parcels are refunded, so the two go together,"
        " but through the outcome acting on the treatment, which no covariate can take out.",
        "Check whether treatment and outcome were swapped, and whether the arrow in the graph points the right way."
        " Otherwise ask about another treatment or outcome, or apply one of the `remedies` if there are any.",
    ),
    "covariate-on-causal-path": RuleText(
        "Part of what the treatment does runs through this column. Comparing rows with equal values of it hides that"
        " part, and can add a link of its own.",
        "Growth asks what a `promotion` does to `late_pickup` and adjusts for `locker_full`: promotions delay pick-ups"
        " by filling lockers, and among equally full lockers just that is gone.",
        "Take the column out of the covariates (or weights, matching, fixed effects). If you do want the effect that"
        " does not run through it, say `asks: direct`, and review that question.",
    ),
    "covariate-below-causal-path": RuleText(
        "The column carries what the treatment has already done. Holding it equal takes out part of the effect, or"
        " lets the outcome itself choose what is compared.",
        "Support estimates what `late_delivery` does to `refund` and adjusts for `repeat_order`: refunded customers"
        " come back, so customers who ordered again are compared by how the refund turned out.",
        "Take the column out. What follows from the outcome, or from a step towards it, is never a covariate.",
    ),
    "covariate-on-collider": RuleText(
        "Two columns that have nothing to do with each other move together among rows with equal values of something"
        " they both bring about. The model takes that for an effect.",
        "Support adjusts for `rated_drop_off`: late parcels get rated, and so do people with a `complaint_habit`. Among"
        " those who rated, a punctual parcel points to a complainer, and `late_delivery` seems to lower refunds.",
        "Take the column out. If you need it for another reason, adjust for the other columns that the finding's path"
        " runs through as well, if `remedies` offers that.",
    ),
    "covariate-below-collider": RuleText(
        "The column tells something of a common consequence higher up, so adjusting for it joins the causes of that"
        " consequence, if more weakly.",
        "Support adjusts for `follow_up_call`, made to customers who rated: among those called, late parcels and"
        " people with a `complaint_habit` stand in for each other, as if the rating itself were adjusted for.",
        "Take the column out, or block the path that it opens with one of the `remedies`.",
    ),
    "filter-on-causal-path": RuleText(
        "The treatment helps to decide which rows are there, on the way to the outcome or by the outcome itself. What"
        " is left of the two groups can no longer be compared.",
        "A dashboard on what `late_delivery` does to `refund` keeps `refund > 0`: parcels that cost nothing are gone,"
        " and they are more of the punctual ones than of the late ones.",
        "Drop that condition from the row filter. Where only part of the rows interests you, choose them by something"
        " that was settled before the treatment.",
    ),
    "filter-below-causal-path": RuleText(
        "The condition reads something that the outcome, or a step towards it, has brought about, so the effect itself"
        " decides who is compared.",
        "Marketing looks at what `late_delivery` does to `refund` among customers with a `repeat_order`: whoever was"
        " annoyed and got no money back never ordered again, and so is not in the data.",
        "Drop that condition from the row filter, and choose rows by something that was settled before the treatment.",
    ),
    "filter-on-collider": RuleText(
        "Where rows are kept by something that two columns bring about, these two go together among the rows kept, even"
        " if they have nothing to do with each other. That reaches the number as a false effect.",
        "An analyst keeps parcels with `ticket_opened`: lateness and a high `order_value` both make people write in."
        " Among the tickets punctual parcels are the expensive ones, and `late_delivery` seems to lower `refund`.",
        "Drop that condition, or adjust for the other cause that the finding's path names (`order_value` in the"
        " example). `remedies` says which of the two suffices.",
    ),
    "filter-below-collider": RuleText(
        "The condition reads a trace of something that two columns bring about; keeping rows by the trace joins the two"
        " as keeping them by the thing itself would.",
        "Support analyses calls only, `follow_up_call = 1`. Calls go to customers who rated, and those are late ones or"
        " born complainers: among the calls the one stands in for the other.",
        "Drop that condition, or block the path that it opens with one of the `remedies`.",
    ),
    "lost-rows-on-causal-path": RuleText(
        "Rows are not there because of the outcome, or of a step towards it. What is left cannot be compared, and no"
        " row filter shows it.",
        "Refunds are joined to the list of parcels that were collected late. Part of what `late_delivery` does to"
        " `refund` runs through `late_pickup`, and in this table every parcel was one.",
        "Load the rows that the join or the rule of retention drops, then take the entry out of"
        " `rows_exist_because` or `missing_because`. If they are lost for good, this effect cannot be read from them.",
    ),
    "lost-rows-below-causal-path": RuleText(
        "Rows are not there because of something that the outcome, or a step towards it, has brought about.",
        "Customer records are deleted a month after the last order, so without a `repeat_order` there is no row: those"
        " whom a missing `refund` drove away are not in the data that is to say what `late_delivery` costs.",
        "Load the rows from where they are still held, then take the entry out of `rows_exist_because` or"
        " `missing_because`. If they are lost for good, this effect cannot be read from them.",
    ),
    "lost-rows-on-collider": RuleText(
        "Rows go missing by something that two columns bring about, and among those left the two go together.",
        "The app records a parcel only where the customer rated the drop-off: raters have a late parcel or a"
        " `complaint_habit`, so in this table `late_delivery` and the habit stand in for each other.",
        "Start from a table that holds every row, or adjust for the other cause that the finding's path names;"
        " `remedies` says whether that suffices.",
    ),
    "lost-rows-below-collider": RuleText(
        "Rows go missing by a trace of something that two columns bring about, which joins the two, if more weakly.",
        "`order_value` is null unless support called, and calls go to those who rated: with nulls dropped, late"
        " parcels and people with a `complaint_habit` stand in for each other.",
        "Fill in what is missing from another source, start from a table that holds every row, or block the path with"
        " one of the `remedies`.",
    ),
    "not-recovered": RuleText(
        "The config claims the effect in everybody, but whose row is there tells of the outcome, and reweighting by"
        " what is known of everybody does not undo that.",
        "The routing team keeps parcels of customers with the app and reports what `late_delivery` does to all"
        " customers: app users order again more readily, and nothing in the covariates makes up for it.",
        "Say `population: kept` and report the number for these rows, or name in `measured_everywhere` covariates whose"
        " distribution over everybody you know; `remedies` says what would do.",
    ),
    "no-variation-left": RuleText(
        "Once everything that the model holds fixed is held fixed, treatment or outcome cannot differ between the rows"
        " compared. The coefficient is undefined, or made of rounding errors.",
        "A model asks what the number of `locker_bays` does and absorbs fixed effects of the locker: within one locker"
        " the number never changes, so nothing is left to compare.",
        "Take out the fixed effect or the computed covariate that the finding names, or ask about a treatment that"
        " varies within it.",
    ),
    "treatment-among-covariates": RuleText(
        "At one value of the treatment nothing about the treatment can be compared.",
        "A script builds its covariates from all columns of the table and so adjusts for `late_delivery`, whose effect"
        " it is to estimate.",
        "Take the treatment, or the column that it is computed from, out of what the model adjusts for.",
    ),
    "outcome-among-covariates": RuleText(
        "At one value of the outcome there is no difference left that the treatment could have made.",
        "A script builds its covariates from all columns of the table and so adjusts for `refund`, which is the"
        " outcome: any effect on it is gone.",
        "Take the outcome out of what the model adjusts for.",
    ),
    "treatment-fixed": RuleText(
        "All rows kept have the same value of the treatment, so there is no other group to compare with.",
        "A query for late parcels, `late_delivery = TRUE`, is reused to estimate what lateness does to `refund`: not"
        " one punctual parcel is in the data.",
        "Drop that condition from the row filter, so that both groups are there.",
    ),
    "outcome-fixed": RuleText(
        "All rows kept have the same value of the outcome, so no difference in it can show.",
        "A table of refunds alone, `refund = TRUE`, is used to estimate what `late_delivery` does to refunds: every"
        " parcel in it was refunded.",
        "Drop that condition from the row filter, so that rows with every outcome are there.",
    ),
    "unmeasured-covariate": RuleText(
        "The model cannot adjust for a column that does not exist, so whatever it was to take out is still in.",
        "A config copied from a plan adjusts for `complaint_habit`, which the graph marks as unmeasured: the fit runs"
        " without it, or with something else of that name.",
        "If you hold the column, take `measured: false` off the node in the graph. If not, take it out of the"
        " config; the review tells what can be done without it.",
    ),
    "unmeasured-filter-column": RuleText(
        "Rows cannot be kept by a column that does not exist, so the rows that the config speaks of are not those that"
        " the model sees.",
        "A filter reads `route_pressure`, which the graph marks as unmeasured: no table says how tight a round was.",
        "If you hold the column, take `measured: false` off the node in the graph. If something unrecorded decides"
        " which rows are there, say so under `rows_exist_because` instead.",
    ),
    "unmeasured-treatment": RuleText(
        "The effect of something that no table holds cannot be estimated from tables.",
        "The staff office asks what `route_pressure` does to `late_delivery`, and nobody records how tight a round is.",
        "If you hold the column, take `measured: false` off the node in the graph; else record it, or ask about"
        " something measured that stands near it, such as `parcel_volume`.",
    ),
    "unmeasured-outcome": RuleText(
        "An effect on something that no table holds cannot be estimated from tables.",
        "Marketing asks what a `promotion` does to how satisfied customers are, and no table holds that.",
        "If you hold the column, take `measured: false` off the node in the graph; else record it, or ask about"
        " a measured outcome, such as `repeat_order`, and name it as what it is.",
    ),
}
