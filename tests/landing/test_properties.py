"""What holds for every landing."""

from hypothesis import given, settings
from hypothesis import strategies as st

from tests.landing.material import contact_on_pad, landed, landing

#: What integration may be off by.
DUST = 1e-6

sizes = st.floats(100, 900)
spreads = st.floats(0, 120)


def of(contact, pad, read, cds, offset):
    pair = landing(contact, pad, least_area=0.8, resistance={"nominal": 8, "limit": 12})
    return landed(contact_on_pad(pair, read=read, cds=cds, terms={"place": {"offset": offset}}))


@settings(max_examples=25, deadline=None)
@given(sizes, sizes, spreads, st.tuples(st.floats(0, 40), st.floats(0, 40)), st.floats(-400, 400))
def test_figures_lie_in_their_ranges(contact, pad, read, cds, offset):
    found = of(contact, pad, read, cds, offset)
    for p in (found.below_least, found.open, found.resistance.above_limit):
        assert 0 <= p <= 1
    low, hundredth, middle = found.area_quantiles
    assert 0 <= low <= hundredth + DUST
    assert hundredth <= middle + DUST
    assert found.open <= found.below_least + DUST
    assert found.fail_probability == max(found.below_least, found.resistance.above_limit)
    assert found.resistance.median <= found.resistance.q99 * (1 + DUST)


@settings(max_examples=15, deadline=None)
@given(
    sizes,
    sizes,
    st.floats(1, 300),
    spreads,
    st.tuples(st.floats(0, 40), st.floats(0, 40)),
    st.floats(-400, 400),
)
def test_a_larger_pad_is_never_worse(contact, pad, larger, read, cds, offset):
    small, large = of(contact, pad, read, cds, offset), of(contact, pad + larger, read, cds, offset)
    assert large.below_least <= small.below_least + 1e-4
    assert large.open <= small.open + 1e-4
    assert large.mean_area >= small.mean_area - 1e-4
    assert large.nominal_area >= small.nominal_area


@settings(max_examples=10, deadline=None)
@given(sizes, sizes, spreads, st.tuples(st.floats(0, 40), st.floats(0, 40)), st.floats(0, 400))
def test_which_way_the_contact_is_off_does_not_matter(contact, pad, read, cds, offset):
    one, other = of(contact, pad, read, cds, offset), of(contact, pad, read, cds, -offset)
    assert abs(one.below_least - other.below_least) <= DUST
