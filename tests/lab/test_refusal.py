from server.lab.refusal import Refusal, Unacceptable


def test_refusal_carries_sentence_field_example_and_both_sides():
    shown = {"standing": "18.64"}
    refused = Unacceptable("Too much.", field="mass", example="0.3888", shown=shown)
    assert isinstance(refused, Refusal)
    assert str(refused) == refused.says == "Too much."
    assert (refused.field, refused.example, refused.shown) == ("mass", "0.3888", shown)
    assert Refusal("No.").shown == {}
