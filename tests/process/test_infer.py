"""Which constants a netlist without a process file gets."""

from __future__ import annotations

from evenstage.process.infer import infer_process

LEVEL1 = {"vto": 0.45, "kp": 170e-6, "tox": 4e-9, "cj": 1e-3}
LEVEL1_P = LEVEL1 | {"vto": -0.45, "kp": 60e-6}


class TestWithoutConstants:
    def test_generic(self) -> None:
        process = infer_process([], supply=1.5)
        assert (process.origin, process.supply) == ("generic", 1.5)
        assert process.type_of("nmos") is not None

    def test_a_card_overrides_a_name(self) -> None:
        process = infer_process([("pch", "NMOS", {}), ("zap", "pmos", {"level": 54.0})])
        kinds = {}
        for name in ("PCH", "zap", "pmos", "nmos"):
            index = process.type_of(name)
            assert index is not None
            kinds[name] = process.transistors[index].polarity
        assert kinds == {"PCH": "n", "zap": "p", "pmos": "p", "nmos": "n"}

    def test_other_cards_do_not_count(self) -> None:
        assert infer_process([("dio", "d", {}), ("q", "npn", {})]).type_of("dio") is None


class TestFromLevel1Cards:
    def test_constants(self) -> None:
        process = infer_process([("a", "nmos", LEVEL1), ("b", "pmos", LEVEL1_P)], 1.8, 180e-9)
        assert process.origin == "models"
        assert process.notices == ()
        assert (process.type_of("a"), process.type_of("b")) == (0, 1)
        assert process.first("n").r_w < process.first("p").r_w

    def test_other_cards_borrow_them(self) -> None:
        models = [("a", "nmos", LEVEL1), ("b", "pmos", LEVEL1_P), ("io", "pmos", {"level": 14.0})]
        process = infer_process(models, 1.8)
        index = process.type_of("io")
        assert index is not None
        assert process.transistors[index].r_w == process.first("p").r_w
        assert [(n.code, n.names) for n in process.notices] == [("model-not-level-1", ("io",))]

    def test_names_without_cards_borrow_them_too(self) -> None:
        process = infer_process([("a", "nmos", LEVEL1), ("b", "pmos", LEVEL1_P)], 1.8)
        index = process.type_of("nmos_x")
        assert index is not None
        assert process.transistors[index].r_w == process.first("n").r_w
