"""The contents of the staged drug-development sample: texts, inputs and rows of formulas.

Ottermoor Therapeutics is an invented company and every figure is invented. In formulas `i.key` stands
for an input's cell, `t.key` for the cell of a row in the same year, `p.key` for the year before,
`r.key` for all years of a row and `s.key` for a single cell or a column of a table.
"""

from __future__ import annotations

import datetime as dt

MILLION = "EUR million"
AMOUNT = "#,##0.0;-#,##0.0;-"
DATE = "yyyy-mm-dd"
WHOLE = "0"
SHARE = "0.0%"
STAGES = ("Preclinical", "Phase 1", "Phase 2", "Phase 3", "Filing")

GUIDE = (
    ("Ottermoor Therapeutics: value of one drug candidate in development", True),
    ("An invented company and an invented medicine; all figures are invented.", False),
    ("What it is", True),
    (
        "A candidate goes through five stages: preclinical work, three clinical phases and filing. "
        "Each stage costs money and may fail. The next stage starts only if the one before succeeded, "
        "so a failure ends the spending.",
        False,
    ),
    (
        "The candidate was licensed in from a partner, who is paid when stages succeed and when sales "
        "pass certain heights, and gets a royalty on sales.",
        False,
    ),
    ("How to read it", True),
    ("Inputs: every number that may be changed, in column C. Nothing else is typed in.", False),
    (
        "Development: the stages with their dates, chances and flags; their cost year by year.",
        False,
    ),
    ("Market: 25 years of sales and costs, on the footing that the drug is launched.", False),
    (
        "Valuation: tax and cash flow, discounted in mid-year, weighed in two ways (see below), and the "
        "six ways in which it can end.",
        False,
    ),
    ("Results: the figures for a memo, with checks.", False),
    ("Two values", True),
    (
        "Risk-adjusted value (rNPV): each cash flow times the chance that it comes about. It is an "
        "average over success and failure, and no single outcome equals it.",
        False,
    ),
    (
        "Value for the flags: each stage has a success flag on Inputs, 1 or 0. The cash flows are "
        "those of exactly that course of events.",
        False,
    ),
    (
        "In the workbook as it is stored all five flags are 1: the candidate reaches the market. The "
        "base case is therefore the lucky case and not what should be expected. Set a flag to 0 to "
        "see what a failure costs.",
        False,
    ),
    (
        "ottermoor_therapeutics.toml draws each flag with the chance on Development. The mean over "
        "many draws comes to the risk-adjusted value when nothing but the flags is drawn.",
        False,
    ),
    (
        "A candidate that fails earns nothing and so pays no tax. That is why the risk-adjusted value "
        "may take tax as it is after a launch, times the chance of a launch.",
        False,
    ),
    ("Amounts are in EUR million unless a unit says otherwise.", False),
    ("Caution", True),
    (
        "The figures are no investment advice and no advice to buy, sell or lend. Tax, accounting, "
        "patent and drug law differ from place to place: a licensed professional and local rules "
        "come first.",
        False,
    ),
)

# Key, label, value, unit, number format, note; a line with a title alone begins a group.
Input = tuple[str, str, float | dt.date, str, str, str]


def _each_stage(
    key: str, label: str, values: tuple[float, ...], unit: str, number_format: str, note: str
) -> tuple[Input, ...]:
    return tuple(
        (f"{key}{n}", label.format(stage), value, unit, number_format, note if n == 1 else "")
        for n, (stage, value) in enumerate(zip(STAGES, values, strict=True), start=1)
    )


def _numbered(
    key: str, label: str, values: tuple[float, ...], unit: str, number_format: str, note: str
) -> tuple[Input, ...]:
    return tuple(
        (f"{key}{n}", label.format(n), value, unit, number_format, note if n == 1 else "")
        for n, value in enumerate(values, start=1)
    )


INPUTS: tuple[Input | str, ...] = (
    "General",
    ("date", "Valuation date", dt.date(2026, 1, 1), "", DATE, "Preclinical work begins on it"),
    ("discount", "Discount rate", 0.105, "a year", SHARE, "Chances are counted apart from it"),
    ("tax", "Tax rate", 0.23, "", SHARE, "Invented; local rules come first"),
    ("losses", "Tax losses carried forward", 24, MILLION, "#,##0.0", "Without limit in time"),
    ("deal", "Partner's contract (1 or 2)", 1, "", WHOLE, "1 royalties first, 2 milestones first"),
    "Stages",
    *_each_stage("cost", "{}, budget", (8, 13, 36, 105, 9), MILLION, "#,##0.0", "As planned"),
    ("over_early", "Overrun to the end of phase 2", 0, "of budget", SHARE, "0 is as budgeted"),
    ("over_late", "Overrun, phase 3 and filing", 0, "of budget", SHARE, "0 is as budgeted"),
    *_each_stage("months", "{}, duration", (15, 14, 24, 36, 12), "months", WHOLE, "Whole months"),
    ("pause", "Pause between stages", 2, "months", WHOLE, "Reading results, asking leave"),
    ("to_launch", "From approval to launch", 4, "months", WHOLE, "Price talks and first stock"),
    *_each_stage(
        "chance", "{}, chance of success", (0.65, 0.58, 0.33, 0.6, 0.9), "", SHARE, "Once started"
    ),
    *_each_stage(
        "flag", "{} succeeds (0 or 1)", (1, 1, 1, 1, 1), "", WHOLE, "1 in the stored workbook"
    ),
    "Partner",
    *_each_stage(
        "first_due", "{}, milestone, contract 1", (0.5, 2, 6, 15, 30), MILLION, "#,##0.0", "On success"
    ),
    *_each_stage(
        "second_due", "{}, milestone, contract 2", (1, 4, 10, 25, 50), MILLION, "#,##0.0", "On success"
    ),
    *_numbered("tier", "Royalty tier {}, from sales of", (0, 200, 500), MILLION, "#,##0", "A year"),
    *_numbered("first_rate", "Royalty tier {}, contract 1", (0.05, 0.07, 0.09), "", SHARE, "On top"),
    *_numbered("second_rate", "Royalty tier {}, contract 2", (0.03, 0.04, 0.05), "", SHARE, "On top"),
    *_numbered(
        "height", "Sales milestone {}, from sales of", (250, 600), MILLION, "#,##0", "First passed"
    ),
    *_numbered("height_due", "Sales milestone {}, payment", (20, 40), MILLION, "#,##0", "Paid once"),
    "Market",
    ("patients", "Patients in the first year", 310, "thousand", "#,##0", "Who could be treated"),
    ("growth", "Growth in patients", 0.012, "a year", SHARE, ""),
    ("peak", "Share of patients at the peak", 0.18, "", SHARE, "Once uptake is complete"),
    *_numbered("after", "Uptake point {}, years", (0, 1, 2, 3, 5, 7), "years", WHOLE, "Since launch"),
    *_numbered(
        "uptake", "Uptake point {}, share", (0, 0.06, 0.22, 0.45, 0.82, 1), "of peak", SHARE, "Between points a line"
    ),
    ("price", "Net price", 12, "EUR thousand", "#,##0.00", "A patient and year, after rebates"),
    ("drift", "Price change", 0.01, "a year", SHARE, ""),
    ("patent", "Patent expiry", dt.date(2043, 6, 30), "", DATE, ""),
    ("shield", "Protection after launch, at least", 10, "years", WHOLE, "Whichever ends later"),
    *_numbered(
        "kept", "Sales kept in year {} after protection", (0.55, 0.3, 0.2, 0.15), "", SHARE, "Year 4 and later alike"
    ),
    "Costs on the market",
    ("goods", "Cost of goods", 0.14, "of sales", SHARE, ""),
    ("selling", "Selling cost", 0.17, "of sales", SHARE, ""),
    ("fixed", "Fixed commercial cost", 28, MILLION, "#,##0", "A year; shrinks with sales kept"),
    *_numbered("launch", "Launch expenses, year {}", (45, 30, 15), MILLION, "#,##0", "On the market"),
    ("working", "Working capital", 0.12, "of sales", SHARE, "Set free in the last year"),
)  # fmt: skip

# Header, number format, formula of the first stage, formula of later stages.
# {n} is the stage, {r} the table's row, {q} the row above; the columns begin at C.
STAGE_TABLE: tuple[tuple[str, str, str, str], ...] = (
    ("Budget", AMOUNT, "=i.cost{n}", "=i.cost{n}"),
    ("Cost with overrun", AMOUNT, "=C{r}*(1+i.{overrun})", "=C{r}*(1+i.{overrun})"),
    ("Chance of success", SHARE, "=i.chance{n}", "=i.chance{n}"),
    ("Success flag", WHOLE, "=i.flag{n}", "=i.flag{n}"),
    ("Months", WHOLE, "=ROUND(i.months{n},0)", "=ROUND(i.months{n},0)"),
    ("Start", DATE, "=i.date", "=EDATE(I{q},i.pause)"),
    ("End", DATE, "=EDATE(H{r},G{r})", "=EDATE(H{r},G{r})"),
    ("Chance that it starts", SHARE, "=1", "=J{q}*E{q}"),
    ("Starts with these flags", WHOLE, "=1", "=K{q}*F{q}"),
    ("Chance that it has succeeded", SHARE, "=J{r}*E{r}", "=J{r}*E{r}"),
    ("Has succeeded with these flags", WHOLE, "=K{r}*F{r}", "=K{r}*F{r}"),
    (
        "Milestone on success",
        AMOUNT,
        "=CHOOSE(i.deal,i.first_due{n},i.second_due{n})",
        "=CHOOSE(i.deal,i.first_due{n},i.second_due{n})",
    ),
    ("Year of the end", WHOLE, "=YEAR(I{r})", "=YEAR(I{r})"),
)

# Key, label, unit, number format, formula, formula of the first year where it differs.
Row = tuple[str, str, str, str, str, str | None]

DEVELOPMENT: tuple[Row | str, ...] = (
    ("year", "Year", "", WHOLE, "=p.year+1", "=YEAR(i.date)"),
    ("n", "Year number", "", WHOLE, "=t.year-YEAR(i.date)+1", None),
    ("from", "First day", "", DATE, "=DATE(t.year,1,1)", None),
    ("to", "First day of the next year", "", DATE, "=DATE(t.year+1,1,1)", None),
    "Cost of each stage if it starts, by days",
    *(
        (
            f"spent{n}",
            stage,
            MILLION,
            AMOUNT,
            f"=s.cost{n}*MAX(0,MIN(s.end{n},t.to)-MAX(s.start{n},t.from))/(s.end{n}-s.start{n})",
            None,
        )
        for n, stage in enumerate(STAGES, start=1)
    ),
    ("spent", "All stages", MILLION, AMOUNT, "=SUM(t.spent1:t.spent5)", None),
    (
        "spent_mean",
        "Times the chance of starting",
        MILLION,
        AMOUNT,
        "=SUMPRODUCT(s.starts_chance,t.spent1:t.spent5)",
        None,
    ),
    (
        "spent_flag",
        "With these flags",
        MILLION,
        AMOUNT,
        "=SUMPRODUCT(s.starts,t.spent1:t.spent5)",
        None,
    ),
    "Milestones to the partner, in the year in which a stage ends",
    ("due", "All stages succeed", MILLION, AMOUNT, "=SUMPRODUCT((s.end_year=t.year)*s.due)", None),
    (
        "due_mean",
        "Times the chance of success",
        MILLION,
        AMOUNT,
        "=SUMPRODUCT((s.end_year=t.year)*s.due*s.success_chance)",
        None,
    ),
    (
        "due_flag",
        "With these flags",
        MILLION,
        AMOUNT,
        "=SUMPRODUCT((s.end_year=t.year)*s.due*s.success)",
        None,
    ),
)

MARKET: tuple[Row | str, ...] = (
    ("m_year", "Year", "", WHOLE, "=t.year", None),
    "Patients and sales, if launched",
    (
        "on",
        "Part of the year on the market",
        "",
        "0.00",
        "=MAX(0,MIN(1,(t.to-s.launch)/(t.to-t.from)))",
        None,
    ),
    (
        "age",
        "Years since launch, mid-period",
        "years",
        "0.00",
        "=MAX(0,(t.to-s.launch)/365.25)-t.on/2",
        None,
    ),
    (
        "age_in",
        "The same, within the uptake points",
        "years",
        "0.00",
        "=MIN(t.age,MAX(i.after))",
        None,
    ),
    (
        "point",
        "Uptake point before it",
        "",
        WHOLE,
        "=MIN(MATCH(t.age_in,i.after,1),ROWS(i.after)-1)",
        None,
    ),
    (
        "ramp",
        "Uptake",
        "of peak",
        SHARE,
        "=INDEX(i.uptake,t.point)+(t.age_in-INDEX(i.after,t.point))"
        "/(INDEX(i.after,t.point+1)-INDEX(i.after,t.point))"
        "*(INDEX(i.uptake,t.point+1)-INDEX(i.uptake,t.point))",
        None,
    ),
    ("pool", "Patients", "thousand", "#,##0", "=i.patients*(1+i.growth)^(t.n-1)", None),
    ("treated", "Patients treated", "thousand", "#,##0.0", "=t.pool*i.peak*t.ramp*t.on", None),
    ("net_price", "Net price", "EUR thousand", "#,##0.00", "=i.price*(1+i.drift)^(t.n-1)", None),
    (
        "covered",
        "Part of the year protected",
        "",
        "0.00",
        "=MAX(0,MIN(1,(s.expiry-t.from)/(t.to-t.from)))",
        None,
    ),
    (
        "open_year",
        "Year after protection",
        "",
        WHOLE,
        "=MIN(ROWS(i.kept),MAX(1,t.year-YEAR(s.expiry)+1))",
        None,
    ),
    ("left", "Sales kept", "", SHARE, "=t.covered+(1-t.covered)*INDEX(i.kept,t.open_year)", None),
    ("sales", "Net sales", MILLION, AMOUNT, "=t.treated*t.net_price*t.left", None),
    ("best", "Highest sales before", MILLION, AMOUNT, "=MAX(p.best,p.sales)", "=0"),
    "Costs, if launched",
    ("goods_cost", "Cost of goods", MILLION, AMOUNT, "=i.goods*t.sales", None),
    (
        "royalty",
        "Royalty to the partner",
        MILLION,
        AMOUNT,
        "=SUMPRODUCT((t.sales>s.tiers)*(t.sales-s.tiers)*s.steps)",
        None,
    ),
    (
        "sold",
        "Selling and fixed commercial cost",
        MILLION,
        AMOUNT,
        "=i.selling*t.sales+i.fixed*t.on*t.left",
        None,
    ),
    ("shelf", "Year on the market", "", WHOLE, "=MAX(0,t.year-YEAR(s.launch)+1)", None),
    (
        "launching",
        "Launch expenses",
        MILLION,
        AMOUNT,
        "=IF(AND(t.shelf>=1,t.shelf<=ROWS(i.launch)),INDEX(i.launch,t.shelf),0)",
        None,
    ),
    (
        "height_paid",
        "Sales milestones to the partner",
        MILLION,
        AMOUNT,
        "=IF(AND(t.sales>=i.height1,t.best<i.height1),i.height_due1,0)"
        "+IF(AND(t.sales>=i.height2,t.best<i.height2),i.height_due2,0)",
        None,
    ),
    (
        "profit",
        "Operating profit on the market",
        MILLION,
        AMOUNT,
        "=t.sales-t.goods_cost-t.royalty-t.sold-t.launching-t.height_paid",
        None,
    ),
    ("margin", "Margin", "of sales", SHARE, "=IFERROR(t.profit/t.sales,0)", None),
    (
        "capital",
        "Working capital",
        MILLION,
        AMOUNT,
        "=IF(t.n=MAX(r.n),0,i.working*t.sales)",
        None,
    ),
    ("tied", "Change in working capital", MILLION, AMOUNT, "=t.capital-p.capital", "=t.capital"),
)

VALUATION: tuple[Row | str, ...] = (
    ("v_year", "Year", "", WHOLE, "=t.year", None),
    ("factor", "Discount factor, mid-year", "", "0.0000", "=1/(1+i.discount)^(t.n-0.5)", None),
    "If every stage succeeds",
    ("taxable", "Profit before tax", MILLION, AMOUNT, "=t.profit-t.spent-t.due", None),
    ("lost", "Tax losses at the start", MILLION, AMOUNT, "=p.lost-p.used+p.made", "=i.losses"),
    ("used", "Tax losses used", MILLION, AMOUNT, "=MIN(t.lost,MAX(t.taxable,0))", None),
    ("made", "Tax losses made", MILLION, AMOUNT, "=MAX(-t.taxable,0)", None),
    ("taxed", "Tax", MILLION, AMOUNT, "=i.tax*(MAX(t.taxable,0)-t.used)", None),
    ("sold_flow", "Cash flow of the market", MILLION, AMOUNT, "=t.profit-t.taxed-t.tied", None),
    ("all_flow", "Cash flow, all stages", MILLION, AMOUNT, "=t.sold_flow-t.spent-t.due", None),
    "Times the chances",
    (
        "mean_flow",
        "Cash flow, risk-adjusted",
        MILLION,
        AMOUNT,
        "=s.launch_chance*t.sold_flow-t.spent_mean-t.due_mean",
        None,
    ),
    ("mean_pv", "Present value", MILLION, AMOUNT, "=t.mean_flow*t.factor", None),
    "With these flags",
    (
        "flag_flow",
        "Cash flow",
        MILLION,
        AMOUNT,
        "=s.launched*t.sold_flow-t.spent_flag-t.due_flag",
        None,
    ),
    ("flag_pv", "Present value", MILLION, AMOUNT, "=t.flag_flow*t.factor", None),
    ("run_pv", "Present value so far", MILLION, AMOUNT, "=p.run_pv+t.flag_pv", "=t.flag_pv"),
)
