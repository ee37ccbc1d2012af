"""Random formulas over the cells of `argument_recipes.CELLS`."""

from __future__ import annotations

from hypothesis import strategies as st

_NUMBERS = ("A1", "A2", "A3", "A4", "F1", "F3", "0", "1", "2", "-1", "0.5", "100")
_MIXED = (
    "G1",
    "G2",
    "G3",
    "H2",
    "H3",
    "I1",
    "M1",
    "M4",
    "R2",
    "B9",
    '""',
    '"3"',
    '"x"',
    "TRUE",
    "NA()",
)
_RANGES = ("F1:F4", "G1:G4", "H1:H4", "I1:I4", "J1:J4", "M1:M4", "A1:A4", "K1:K4")
_ONE = (
    "ABS", "SIGN", "INT", "SQRT", "EXP", "LN", "NOT", "ISERROR", "ISNUMBER", "ISTEXT", "ISBLANK", "ISNA",
    "N", "T", "LEN", "VALUE", "ISLOGICAL", "TYPE", "UPPER", "EVEN", "ISERR", "MONTH", "COS", "TRIM",
)  # fmt: skip
_TWO = ("ROUND", "MOD", "POWER", "IFERROR", "IFNA", "EXACT", "AND", "OR", "XOR", "MAX", "MIN", "SUM", "COUNT", "LEFT", "LOG", "ATAN2", "COUNTA", "CONCATENATE", "REPT", "PRODUCT", "AVERAGE")  # fmt: skip
_OF_RANGE = (
    "SUM", "AVERAGE", "COUNT", "COUNTA", "MAX", "MIN", "MEDIAN", "STDEV", "PRODUCT", "VARP", "AND", "OR",
    "SUMSQ", "COUNTBLANK", "AVERAGEA", "ROWS",
)  # fmt: skip
_RANGE_AND_VALUE = ("LARGE({r},{v})", "COUNTIF({r},{v})", "SUMIF({r},{v})", "INDEX({r},{v})", "MATCH({v},{r},0)", "PERCENTILE({r},{v})", "SUMIF({r},{v},J1:J4)", "MATCH({v},{r})", "VLOOKUP({v},J1:L4,2,FALSE)", "SUMPRODUCT(--({r}={v}))", "NPV({v},{r})", "RANK({v},{r})", "COUNTIFS({r},{v},J1:J4,\">1\")", "XLOOKUP({v},J1:J4,{r},\"none\")")  # fmt: skip
_ARITHMETIC = ("+", "-", "*", "/")
_OPERATORS = (*_ARITHMETIC, "^", "&", "=", "<>", "<", "<=", ">", ">=")


def formulas(depth: int, *, arithmetic: bool = False) -> st.SearchStrategy[str]:
    """Formulas of at most so many levels.

    Args:
        depth: The most levels.
        arithmetic: Only numbers, the four operations, comparisons and branches.
    """
    if depth <= 1:
        return st.sampled_from(_NUMBERS if arithmetic else (*_NUMBERS, *_MIXED))
    inner = formulas(depth - 1, arithmetic=arithmetic)
    operators = st.sampled_from(_ARITHMETIC if arithmetic else _OPERATORS)
    choices: list[st.SearchStrategy[str]] = [
        formulas(1, arithmetic=arithmetic),
        st.builds("({}{}{})".format, inner, operators, inner),
        st.builds("({}{}{})".format, inner, operators, inner),
        st.builds("IF({}>{},{},{})".format, inner, inner, inner, inner),
        st.builds("-{}".format, inner.map("({})".format)),
    ]
    if arithmetic:
        return st.one_of(choices)
    return st.one_of(
        *choices,
        st.builds("IF({},{},{})".format, inner, inner, inner),
        st.builds("{}({})".format, st.sampled_from(_ONE), inner),
        st.builds("{}({},{})".format, st.sampled_from(_TWO), inner, inner),
        st.builds("{}({})".format, st.sampled_from(_OF_RANGE), st.sampled_from(_RANGES)),
        st.builds(
            lambda form, area, value: form.format(r=area, v=value),
            st.sampled_from(_RANGE_AND_VALUE),
            st.sampled_from(_RANGES),
            inner,
        ),
        st.builds("CHOOSE({},{},{})".format, inner, inner, inner),
        st.builds("IFS({},{},{},{})".format, inner, inner, inner, inner),
        st.builds("SWITCH({},{},{},{})".format, inner, inner, inner, inner),
        st.builds("LET(v,{},v+{})".format, inner, inner),
    )
