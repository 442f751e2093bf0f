"""How devices, conditions and functions are written.

Habits that netlists in the wild have: read, or refused with one clear message. One test or more
for each habit; the docstring says which habit it is.
"""

from __future__ import annotations

import pytest

from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.rewriting.edits import Edit, rewrite
from evenstage.pattern import Pattern
from support.dialects import INV, TAIL, codes, laid, microns, refusal, text_of
from support.sized import process


class TestConditionsAndFunctions:
    """Habits beyond the list: parts under a condition, functions of the netlist's own."""

    TEXT = (
        ".param corner=%s\n.if (corner==1)\nm1 a b 0 0 nch w=1u l=1u\n.elseif corner==2 $ slow\n"
        ".if (corner>9)\nbroken (\n.else\nm1 a b 0 0 nch w=2u l=1u\n.endif\n.else\n.subckt s a\n"
        ".ends\nm1 a b 0 0 nch w=3u l=1u\n.endif\nm2 a b 0 0 nch w=9u l=1u\n"
    )

    @pytest.mark.parametrize("corner", [1, 2, 3])
    def test_parts_under_a_condition(self, corner: int) -> None:
        """Only the part whose condition holds is read."""
        assert microns(laid(self.TEXT % corner)) == [corner, 9.0]

    @pytest.mark.parametrize(
        "definition",
        [
            ".func grow(x,y) {x*y+off}",
            ".func grow(x,y) 'x*y+off'",
            ".FUNC Grow(X, Y) = 'x*y+off'",
            ".param k=1 grow(x,y)='x*y+off' j=2",
            ".func grow(x, y)\n+ {x*y +\n+ off}",
        ],
    )
    def test_functions(self, definition: str) -> None:
        """A netlist may define functions; other names in them are those of the top level."""
        text = f".param off=1u\n{definition}\n.subckt s a b off=5u\nm1 a b 0 0 nch w='grow(off,2)'"
        assert microns(laid(f"{text} l=1u\n.ends\nx1 a b s\n")) == [11.0]

    def test_a_function_that_is_there_already(self) -> None:
        """A function known anyway keeps its meaning, with a notice."""
        netlist = text_of(".func max(x,y) {1}\nm1 a b 0 0 nch w='max(1,3)' l=1u\n")
        assert [n.code for n in netlist.notices] == ["function-kept"]


class TestDevices:
    def test_undefined_subcircuits_that_are_transistors(self) -> None:
        """A call of something undefined that the process knows, with w and l, is a transistor."""
        kit = process(models=(Pattern("xx_nfet*"),))
        netlist = text_of("x1 d g s b xx_nfet_01v8 w=0.65 l=0.15\n")
        devices = elaborate(netlist, None, kit)
        assert (microns(devices), devices.models[0].name) == ([0.65], "xx_nfet_01v8")

    @pytest.mark.parametrize(
        ("name", "ports"), [("nmos1", "d g s b"), ("nmos1", "d s g b"), ("nch", "b s g d")]
    )
    def test_wrappers(self, name: str, ports: str) -> None:
        """A definition around one transistor is one, ports permuted, or named like its model."""
        text = f".subckt {name} {ports} w=1u l=1u\nm0 d g s b nch w=w l=l\n.ends\n"
        devices = laid(f"{text}x1 {ports.upper()} {name} w=3u\n")
        names = devices.net_names
        pins = (devices.drain, devices.gate, devices.source, devices.bulk)
        assert [names[int(pin[0])] for pin in pins] == ["D", "G", "S", "B"]
        assert microns(devices) == [3.0]

    def test_a_wrapper_with_a_net_of_its_own(self) -> None:
        """Where not all its nets are ports, a definition around one transistor is an instance."""
        text = ".subckt n3 d g s w=1u\nm0 d g s 0 nch w=w l=1u\n.ends\nx1 d g s n3 w=3u\n"
        devices = laid(text)
        assert (microns(devices), devices.card_path(int(devices.card[0]), 1)) == ([3.0], "x1.m0")

    def test_a_wrapper_around_a_call_of_its_own_name(self) -> None:
        """A wrapper that calls its own name means the model inside: it does not go on for ever."""
        text = ".subckt nfet d g s b w=1u l=1u\nx0 d g s b nfet w=w l=l\n.ends\n"
        assert microns(laid(f"{text}x1 d g s b nfet w=3u l=1u\n")) == [3.0]

    @pytest.mark.parametrize(
        ("names", "reason"),
        [
            (("nch", "pch"), "its name"),
            (("n", "p"), "its name"),
            (("nshort", "phighvt"), "its name"),
            (("modn", "modp"), "its bulk net"),
        ],
    )
    def test_model_names(self, names: tuple[str, str], reason: str) -> None:
        """What a model is follows from its name, else from the bulk net, and is said."""
        text = "".join(
            f"m{k} d g s {bulk} {name} {TAIL}\n"
            for k, (name, bulk) in enumerate(zip(names, ("vss", "vdd"), strict=True))
        )
        devices = elaborate(text_of(text), None, process(models=(Pattern("other"),)))
        assert [model.polarity for model in devices.models] == ["n", "p"]
        said = [n.message for n in devices.notices if n.code == "type-assumed"]
        assert [message.endswith(reason) for message in said] == [True, True]

    def test_the_model_card_comes_before_the_name(self) -> None:
        """The model card says the type, whatever the name."""
        text = f".model pfast nmos level=1\nm1 d g s vss pfast {TAIL}\n"
        assert [model.polarity for model in laid(text).models] == ["n"]

    LOCAL = (
        ".model sw nmos level=1 vto=0.5 kp=100u tox=4n\n"
        ".subckt a d g s b\n.model sw pmos level=1 vto=-0.5 kp=50u tox=4n\n"
        f"m1 d g s b sw {TAIL}\n.subckt deep d g s b\nm1 d g s b sw {TAIL}\n.ends deep\n"
        "x1 d g s b deep\n.ends a\n"
        f".subckt c d g s b\nm1 d g s b sw {TAIL}\n.ends\n"
    )

    def test_a_model_inside_a_subcircuit_is_known_there_alone(self) -> None:
        """A model card inside a subcircuit counts there and in what is defined inside it."""
        devices = laid(f"{self.LOCAL}x1 d g s b a\nx2 d g s b c\nm1 d g s b sw {TAIL}\n")
        polarity = [devices.models[k].polarity for k in devices.model.tolist()]
        assert polarity == ["n", "p", "p", "n"]
        assert {model.name for model in devices.models} == {"sw"}

    def test_a_model_inside_another_subcircuit_is_unknown(self) -> None:
        """A model that only another subcircuit holds says nothing about a card elsewhere."""
        text = f".subckt a d\n.model sw nmos\nm1 d d 0 0 sw {TAIL}\n.ends\nm1 d d x x sw {TAIL}\n"
        assert "no transistor type covers the model 'sw'" in refusal(text + "x1 d a\n")

    def test_a_process_file_covers_models_inside_subcircuits_by_their_own_name(self) -> None:
        """The process file says what a model is, wherever its card stands."""
        kit = process(models=(Pattern("sw"),))
        devices = elaborate(text_of(f"{self.LOCAL}x1 d g s b a\n"), None, kit)
        assert {model.type_index for model in devices.models} == {0}

    def test_a_bulk_on_the_wrong_rail(self) -> None:
        """The bulk net is only a second opinion."""
        assert [m.polarity for m in laid(f"m1 d g s vss pch {TAIL}\n").models] == ["p"]

    def test_drain_and_source_stand_as_written(self) -> None:
        """A rail may stand in the place of the drain."""
        devices = laid(f"m1 vss a y vss nch {TAIL}\n")
        assert devices.net_names[int(devices.drain[0])] == "vss"

    @pytest.mark.parametrize(
        ("width", "length", "meant"),
        [
            ("650000u", "150000u", 0.65),
            ("1.12e+06u", "150000u", 1.12),
            ("0.65", "0.15", 0.65),
            ("8.2e-07", "1.5e-07", 0.82),
            ("81.0n", "40n", 0.081),
            ("640.00n", "60n", 0.64),
            ("0.21U", "0.15U", 0.21),
            ("3.93um", "0.15um", 3.93),
            ("'0.5*1.3'", "0.15", 0.65),
            ("650", "150", 0.65),
        ],
    )
    def test_spellings_of_a_width(self, width: str, length: str, meant: float) -> None:
        """Widths come in metres, microns or nanometres; what makes sense is taken and said."""
        devices = laid(f"m1 d g s b nch w={width} l={length}\n")
        assert microns(devices) == pytest.approx([meant], rel=1e-9)

    def test_the_unit_that_was_taken_is_said_and_can_be_set(self) -> None:
        """A notice names the unit and how to set it; the process file overrules the guess."""
        text = "m1 d g s b nch w=0.65 l=0.15\n"
        (said,) = [n.message for n in laid(text).notices if n.code == "size-unit"]
        assert said.startswith("sizes of transistors given as numbers without a suffix are read in")
        assert said.endswith("width_unit in the process file overrules this")
        netlist = text_of(text)
        devices = elaborate(netlist, None, process(width_unit=2e-6))
        assert microns(devices) == [1.3]
        assert "size-unit" not in codes(devices)

    def test_integers_with_a_scale(self) -> None:
        """A scale option says what a bare number is worth."""
        assert microns(laid(".option scale=5n\nm1 d g s b nch w=130 l=30\n")) == [0.65]

    def test_no_width(self) -> None:
        """Without a width the option's default counts, else the card is refused."""
        assert microns(laid(".option defw=2u defl=1u\nm1 d g s b nch\n")) == [2.0]
        assert "'m1' has no width" in refusal("m1 d g s b nch l=1u\n")

    @pytest.mark.parametrize(
        ("size", "code", "read_as"),
        [
            ("w=1e-30 l=1u", "bad-width", "'1e-30', which is read as 1e-30 m"),
            ("w=1e30 l=1u", "bad-width", "'1e30', which is read as 1e+21 m"),
            ("w='1n*1n' l=1u", "bad-width", "''1n*1n'', which is read as 1e-18 m"),
            ("w=1u l=1e-15", "bad-length", "'1e-15', which is read as 1e-15 m"),
        ],
    )
    def test_sizes_that_cannot_be(self, size: str, code: str, read_as: str) -> None:
        """A size no transistor has is refused with how it was read and what sets the unit."""
        text = refusal(f"m1 d g s b nch {size}\n")
        assert f"must be between 0.2 nm and 1 km, got {read_as}; width_unit in" in text
        assert text.endswith(f"({code})")

    def test_a_unit_that_makes_no_sense(self) -> None:
        """A unit that was set and fits no card is seen from the first size it spoils."""
        text = refusal(".option scale=1e-20\nm1 d g s b nch w=1u l=1u\n")
        assert "got '1u', which is read as 1e-26 m" in text

    @pytest.mark.parametrize(
        ("card", "width", "copies", "fingers"),
        [
            ("w=4u m=2", 4.0, 2, 1),
            ("w=4u m=1 mult=1", 4.0, 1, 1),
            ("w=4u mult=3", 4.0, 3, 1),
            ("w=4u nf=2", 4.0, 1, 2),
            ("w=4u ng=2 m=1", 4.0, 1, 2),
        ],
    )
    def test_fingers_and_multipliers(
        self, card: str, width: float, copies: float, fingers: float
    ) -> None:
        """Multipliers multiply; a width is that of all fingers unless the process says other."""
        devices = laid(f"m1 d g s b nch {card} l=1u\n")
        assert microns(devices) == [width]
        assert (devices.multiplier[0], devices.fingers[0]) == (copies, fingers)

    def test_what_a_width_with_fingers_means_is_said_unless_the_process_says_it(self) -> None:
        """A notice tells what was taken and what overrules it."""
        text = "m1 d g s b nch w=4u nf=2 l=1u\n"
        (said,) = [n for n in laid(text).notices if n.code == "finger-width"]
        assert said.message == (
            "the width of cards with several fingers is taken as that of all fingers together; "
            "width_is in the process file overrules this"
        )
        assert said.place == "top.sp:2:1"
        told = elaborate(text_of(text), None, process(width_is_said=True))
        assert "finger-width" not in codes(told)
        assert "finger-width" not in codes(laid(text.replace("nf=2", "nf=1")))

    def test_both_multipliers_on_one_card_are_said(self) -> None:
        """Where both are more than one, both count, with a notice."""
        devices = laid("m1 d g s b nch w=4u m=2 mult=3 l=1u\n")
        assert devices.multiplier.tolist() == [6.0]
        assert "both-multipliers" in codes(devices)

    def test_the_width_of_a_finger_and_counts_of_fins(self) -> None:
        """The process says whether a width is of one finger, or counts fins."""
        netlist = text_of("m1 d g s b nch w=2u l=1u nf=3\n")
        assert microns(elaborate(netlist, None, process(width_is="finger"))) == [6.0]
        fins = process(width_is="fins", width_parameter="nfin", width_unit=50e-9)
        netlist = text_of("m1 d g s b nch nfin=4 l=1u\n")
        assert microns(elaborate(netlist, None, fins)) == [0.2]

    def test_fingers_drawn_as_cards(self) -> None:
        """Fingers drawn as parallel cards stay cards here; areas may stand on one of them only."""
        text = "m1 y a 0 0 nch w=1u l=1u ad=1p\nm1__2 y a 0 0 nch w=1u l=1u ad=0p\n"
        devices = laid(text)
        assert devices.drain_area.tolist() == pytest.approx([1e-12, 0.0], rel=1e-9)

    def test_foreign_parameters_are_kept(self) -> None:
        """Parameters we know nothing of stay where they are."""
        tail = "sa=1u sb=1u sd=0 nrd=0.1 nrs=0.1 area=2p perim=3u topography=normal ic=0,1,0.5"
        text = f"m1 d g s b nch w=1u l=1u {tail} off\n"
        netlist = text_of(text)
        after = rewrite(netlist, [Edit(netlist.card(0).parameters[0].span, b"2u")])
        assert list(after.values()) == [b"* t\n" + text.replace("w=1u", "w=2u").encode()]

    @pytest.mark.parametrize(
        "card", ["nch off w=1u l=1u", "nch w=1u OFF l=1u", "nch w=1u l=1u off"]
    )
    def test_a_word_that_stands_alone(self, card: str) -> None:
        """The word that starts a device switched off may stand among the parameters."""
        assert microns(laid(f"m1 d g s b {card}\n")) == [1.0]

    def test_odd_devices(self) -> None:
        """Decoupling and dummy devices, diodes of transistors, tie-offs, open ports are read."""
        text = (
            f"m1 0 vdd 0 0 nch {TAIL}\nm2 a a 0 0 nch {TAIL}\nm3 b c b 0 nch {TAIL}\n"
            "d1 0 a dn area=1p\nr1 vdd tie 0\n" + INV + "x1 a open vdd 0 inv\n"
        )
        devices = laid(text)
        assert len(devices) == 5
        assert "1 diode left out, not understood ('d1')" in {n.message for n in devices.notices}

    @pytest.mark.parametrize(
        "card",
        ["m1 d g s nch", "m1 g nch", "m1 (d g s) nch", "m1 a b c d e f g h nch"],
    )
    def test_a_net_missing_or_too_many(self, card: str) -> None:
        """A card with a net missing, or with more than any kit has, is refused with its line."""
        text = refusal(f"{card} {TAIL}\n")
        assert text.startswith("top.sp:2:")
        assert "'m1' needs four nets (drain, gate, source, bulk) and a model, got" in text

    @pytest.mark.parametrize("pins", ["d g s e b", "d g s e p b", "d g s e p b t", "(d g s e b)"])
    @pytest.mark.parametrize("tail", ["nch w=1u l=1u", "nch off w=1u l=1u", "nch\n+ w = 1u l=1u"])
    def test_transistors_with_further_pins(self, pins: str, tail: str) -> None:
        """Of more than four nets the first four are the usual ones; the others load nothing."""
        devices = laid("".join(f"m{k} {pins} {tail}\n" for k in range(5)))
        names = devices.net_names
        found = (devices.drain, devices.gate, devices.source, devices.bulk)
        assert [names[int(pin[4])] for pin in found] == ["d", "g", "s", "e"]
        assert microns(devices) == [1.0] * 5
        (said,) = [n for n in devices.notices if n.code == "further-pins"]
        assert said.message.startswith("5 transistors with more than four nets: the first four")
        assert (said.place, len(said.names)) == ("top.sp:2:1", 5)

    def test_wrapped_transistors_with_further_pins(self) -> None:
        """Calls of transistors that nobody defines may have further pins too."""
        devices = laid("x1 d g s e b nmos_soi w=1u l=1u\n")
        assert devices.net_names[int(devices.bulk[0])] == "e"
        assert "further-pins" in codes(devices)

    def test_a_net_missing_on_a_call(self) -> None:
        """A call must give as many nets as there are ports."""
        assert "'inv' has 4 ports, but 'x1' gives 3 nets" in refusal(INV + "x1 a b vdd inv\n")
