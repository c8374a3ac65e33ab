import pytest

from server.lab.roles import Act, Role, holders, may

# the table of who may do what, as the laboratory states it
TABLE = {
    Act.MAKE_UP: {"analyst"},
    Act.BOTTLE: {"analyst"},
    Act.WRITE: {"analyst"},
    Act.HAND_IN: {"analyst"},
    Act.COUNTERSIGN: {"countersigner"},
    Act.HOLD: {"analyst", "countersigner", "keeper"},
    Act.RELEASE: {"keeper", "countersigner"},
    Act.KEEP: {"keeper"},
    Act.LOG: {"analyst", "keeper"},
    Act.USE: {"analyst", "keeper"},
    Act.LABEL: {"analyst", "keeper"},
    Act.OVERRIDE: {"keeper"},
    Act.PROPOSE_PULL: {"keeper"},
    Act.CONFIRM_PULL: {"countersigner"},
    Act.ADMINISTER: {"steward"},
    Act.READ: {"analyst", "countersigner", "keeper", "steward", "reader"},
    Act.READ_UNCERTIFIED: {"analyst", "countersigner"},
}


@pytest.mark.parametrize("act", list(Act))
@pytest.mark.parametrize("role", list(Role))
def test_role_act_is_allowed_exactly_by_the_table(act, role):
    assert may([role.value], act) is (role.value in TABLE[act])


def test_holders_of_an_act_are_in_alphabetical_order():
    assert holders(Act.HOLD) == ["analyst", "countersigner", "keeper"]


def test_no_role_may_nothing():
    assert not any(may([], act) for act in Act)


def test_unknown_role_is_an_error_not_a_permission():
    with pytest.raises(ValueError, match="king"):
        may(["king"], Act.WRITE)
