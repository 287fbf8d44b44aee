"""Stacks that several tests share: invented, each with what makes it hard."""

from transport import Delta, Layer, Lead, Stack

LEAD = Lead(0.0, 0.067)


def barrier(thickness: float) -> Layer:
    """A 300 meV barrier."""
    return Layer(thickness, 0.3, 0.092)


def well(thickness: float) -> Layer:
    """A well at the leads' edge."""
    return Layer(thickness, 0.0, 0.067)


PLAIN = Stack(LEAD, (), (barrier(3.0), well(5.0)), 8, (), LEAD)
CLOSED_OFF = Stack(LEAD, (), (barrier(3.0), well(5.0)), 8, (barrier(3.0),), LEAD)
UNEQUAL = Stack(LEAD, (barrier(1.5),), (well(5.0), barrier(3.0)), 6, (well(7.0), barrier(2.0)), Lead(0.03, 0.09))
OPAQUE = Stack(LEAD, (), (barrier(30.0), well(5.0)), 3, (barrier(30.0),), LEAD)
FREE = Stack(LEAD, (), (well(3.0), well(5.0)), 4, (), LEAD)
DELTAS = Stack(Lead(0.0, 1.0), (), (Delta(0.2), Layer(0.8, 0.0, 1.0)), 7, (Delta(0.2),), Lead(0.0, 1.0))
END_WELLS = Stack(
    LEAD, (barrier(3.0), well(7.0), barrier(3.0)), (well(5.0), barrier(3.0)), 6, (well(7.0), barrier(3.0)), LEAD
)
LOSSY = Stack(LEAD, (), (barrier(3.0), well(5.0)), 8, (barrier(3.0),), LEAD, dephasing=0.004)
KANE_LEAD = Lead(0.0, 0.067, 0.65)
KANE = Stack(KANE_LEAD, (), (Layer(3.0, 0.3, 0.092, 0.5), Layer(5.0, 0.0, 0.067, 0.65)), 8, (), KANE_LEAD)

ALL = {
    "plain": PLAIN, "closed off": CLOSED_OFF, "unequal": UNEQUAL, "opaque": OPAQUE, "free": FREE, "deltas": DELTAS,
    "end wells": END_WELLS, "Kane": KANE,
}
