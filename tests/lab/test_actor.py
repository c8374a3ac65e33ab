import pytest

from server.lab.actor import Actor
from server.lab.refusal import NotAllowed
from server.lab.roles import Act


def person(*roles):
    return Actor("p-1", "Ida Mohnke", "IM", frozenset(roles), "Europe/Berlin")


def test_actor_with_role_may_and_need_passes():
    assert person("analyst").may(Act.WRITE)
    person("analyst").need(Act.WRITE)


def test_actor_without_role_is_refused_with_the_roles_that_may():
    with pytest.raises(NotAllowed) as refused:
        person("reader").need(Act.RELEASE)
    assert refused.value.says == "To release a hold you need the role countersigner or keeper."
