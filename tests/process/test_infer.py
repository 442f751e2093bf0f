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


class TestFromOtherLevels:
    BSIM = {  # noqa: RUF012 -- a constant
        "level": 54.0,
        "toxe": 4e-9,
        "cgso": 0.1e-9,
        "cgdo": 0.12e-9,
        "cjs": 1e-3,
        "cjsws": 0.2e-9,
        "pbs": 0.8,
        "mjs": 0.5,
        "mjsws": 0.33,
        "vth0": 0.4,
    }

    def test_capacitances_that_mean_the_same_are_taken(self) -> None:
        """They equal those of a level-1 card with the same parameters."""
        names = {"toxe": "tox", "cjs": "cj", "cjsws": "cjsw", "pbs": "pb", "mjs": "mj"}
        same = {names.get(key, key): value for key, value in self.BSIM.items()}
        same |= {"mjsw": 0.33, "level": 1.0, "vto": 0.4, "kp": 100e-6}
        models = [("a", "nmos", self.BSIM), ("b", "pmos", self.BSIM)]
        process = infer_process(models, 1.8, 130e-9)
        level1 = infer_process([("a", "nmos", same), ("b", "pmos", same)], 1.8, 130e-9)
        for one, other in ((process, level1),):
            for polarity in ("n", "p"):
                mine, theirs = one.first(polarity), other.first(polarity)
                for key in ("c_gate", "c_drain", "c_drain_fixed", "junctions"):
                    assert getattr(mine, key) == getattr(theirs, key)
        assert process.first("n").r_w == infer_process([], 1.8, 130e-9).first("n").r_w
        told = next(n for n in process.notices if n.code == "capacitances-taken")
        assert told.names == ("a", "b")
        assert "(toxe, cgso, cgdo, cjs, cjsws, pbs, mjs, mjsws)" in told.message
        assert "r_w" in told.message

    def test_an_oxide_alone_makes_the_gate(self) -> None:
        process = infer_process([("a", "nmos", {"level": 8.0, "tox": 4e-9})], 1.8, 130e-9)
        generic = infer_process([], 1.8, 130e-9)
        c_gate = 3.9 * 8.8541878128e-12 / 4e-9 * 130e-9
        assert process.first("n").c_gate == c_gate
        assert process.first("n").c_drain == generic.first("n").c_drain
        assert process.first("p").c_gate == generic.first("p").c_gate
