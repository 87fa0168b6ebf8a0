"""A study written by hand: invented test data with the shape of a real one, not a result of the program."""

import cmath
import math
from dataclasses import replace

from relaycfg.model import break_results as b
from relaycfg.model import results as r
from relaycfg.model import site as s
from relaycfg.model.device import Accuracy, Device, Element, Function, SettableRange
from relaycfg.model.geometry import three_phase
from relaycfg.model.settings import Settings, Stage

OVER, UNDER, SHIFT, UNBAL = Function.OVERVOLTAGE, Function.UNDERVOLTAGE, Function.DISPLACEMENT, Function.UNBALANCE
EVIL = 'Canteen <b>& "Kitchen" ]]> <img src="file:///x">'
DIGEST = "sha256:4b1f0c9a7d2e8830515c6f2a9be4d7713a0c5d8e6f9b2a1c4d7e8f0a1b2c3d4e"


def device() -> Device:
    accuracy = Accuracy(1.0, 0.0, 1.0, 0.02, "greater")
    delay = SettableRange(0.05, 20.0, 0.05)

    def element(function: Function, stages: int, quantity: str, knob: str, unit: str = "percent") -> Element:
        pickup = SettableRange(1.0, 320.0, 0.5)
        return Element(
            function,
            stages,
            pickup,
            "percent" if unit == "percent" else "v",
            230.0 if unit == "percent" else None,
            delay,
            (0.97,),
            ("instantaneous",),
            0.0,
            accuracy,
            quantity,
            "L1 L2 L3 N",
            knob,
        )

    return Device(
        "Test relay type VR-4",
        ("l-n",),
        "rms",
        1.0,
        0.5,
        "per phase",
        "l-n",
        (
            element(OVER, 3, "l-n", "dial U>"),
            element(UNDER, 2, "l-n", "dial U<"),
            element(SHIFT, 2, "v0", "dial U0>", "v"),
        ),
    )


def share(count: int, of: int = 400) -> b.Share:
    p, z = count / of, 1.96
    middle = (p + z * z / (2 * of)) / (1 + z * z / of)
    half = z / (1 + z * z / of) * math.sqrt(p * (1 - p) / of + z * z / (4 * of * of))
    return b.Share(count, of, max(0.0, middle - half), min(1.0, middle + half))


def the_site(paper: str = "A4", boards: int = 3, inputs: int = 60) -> s.Site:
    names = [
        "Main board",
        EVIL,
        "Workshop",
        *(f"Board {k:02d} with a name of some sixty characters, third floor, east" for k in range(4, 99)),
    ]
    cable = s.Cable(0.03 + 0.01j, 0.06 + 0.01j, None, 0.025 + 0.01j, 0.05 + 0.01j, None)
    placed = tuple(
        s.Board(
            name, "source" if k == 0 else names[0] if k < 3 else names[k // 2], cable, k == 0, 5.0 if k == 0 else None
        )
        for k, name in enumerate(names[:boards])
    )
    tags: tuple[s.Tag, ...] = ("measured", "nameplate", "letter", "assumed", "default")
    given = tuple(
        s.Input(
            f"loads[{k}].rating_kw" if k > 6 else f"supply.field_{k}",
            f"{1.5 * k + 0.3:.2f}",
            "kW" if k > 6 else "V",
            tags[k % 5],
            "household coefficients, row 4 of the table of load kinds"
            if tags[k % 5] == "default"
            else "survey of the installation",
            ("memory", "read", "own")[k % 3] if tags[k % 5] == "default" else "",
        )
        for k in range(inputs)
    )
    relay = s.Relay(
        "K1",
        names[0],
        names[0],
        "lines and neutral",
        device(),
        s.Feed("L1-L2", 160.0, 480.0),
        "shunt",
        s.Feed("L2-L3", 280.0, 440.0),
        0.02,
        0.05,
    )
    return s.Site(
        document=s.Document(
            "Lost-neutral relay of the main board, Example House",
            "VR-0017",
            "B",
            "draft",
            "",
            "Example House, north wing",
            "A4" if paper == "A4" else "Letter",
            "duty desk, internal 400",
            s.Person("T. Example", "design"),
            s.Person("", "protection"),
            s.Person(),
            s.Person(),
        ),
        supply=s.Supply(
            three_phase(),
            230.0,
            50.0,
            "TN-C-S",
            195.5,
            253.0,
            "+10/-15 %",
            "EN 50160, 100 % row",
            "quoted",
            "supply terminals",
            2.0,
            1.0,
        ),
        source=s.Source("T1 400 kVA", "transformer", 242.0, 0.005 + 0.016j, 0j, 1e-4, 2.0, "star-point"),
        boards=placed,
        loads=(),
        motors=(),
        faults=(),
        relay=relay,
        equipment=s.Equipment(
            253.0,
            15.0,
            ((275.0, 3.0), (300.0, 0.75), (350.0, 0.2)),
            175.0,
            10.0,
            ((150.0, 1.2),),
            "household reference envelope",
            "EN 50550, operating times",
            "memory",
        ),
        reference=s.ReferenceCases((), (), 0.3, "practice value", "own"),
        user_cases=(),
        inputs=given,
        warnings=("The tap position was not stated; the nominal tap is assumed.",),
        digest=DIGEST,
    )


def stage(
    function: Function,
    number: int,
    pickup: float,
    delay_s: float,
    drop: float,
    percent: float | None,
    base: str,
    why: str,
) -> r.StageResult:
    set_to = Stage(
        function, number, True, pickup, delay_s, drop, quantity={OVER: "l-n", UNDER: "l-n", SHIFT: "v0"}[function]
    )
    percents = percent is not None and function is not SHIFT
    margins = r.Margins(4.1, 0.42, 1.8, "case 4, swell 115 % 2 s", 9.3, None, 2.4, "break at Main board, 300 V")
    bounds = (
        r.Bound(
            "pickup",
            "not below",
            261.0,
            "V",
            "case 1, upper limit",
            "253 / (0.98 × 0.99) = 260.8 V, next step 261.0 V",
            "EN 50160, 100 % row",
        ),
        r.Bound("delay", "not below", 2.05, "s", "case 4, swell", "2.00 s + window 0.02 s + 0.02 s", "reference set"),
        r.Bound(
            "delay", "not above", 14.2, "s", "break at Main board", "15.00 - 0.07 - 0.15 s", "EN 50550, operating times"
        ),
    )
    return r.StageResult(
        set_to,
        percent,
        base,
        percent if percents else pickup,
        "%" if percents else "V",
        pickup * 0.99,
        pickup * 1.01,
        delay_s + 0.13,
        True,
        bounds,
        margins,
        53.0,
        why,
    )


def stages() -> tuple[r.StageResult, ...]:
    base = "U0 230 V"
    off = Stage(UNDER, 2, False)
    return (
        stage(
            OVER,
            1,
            266.8,
            4.1,
            0.98,
            116.0,
            base,
            "Above the supply's upper limit with error and drop-out, and longer than the 2 s swell.",
        ),
        stage(OVER, 2, 282.9, 1.5, 0.98, 123.0, base, "Clears the states above 275 V within their 3 s."),
        stage(
            OVER, 3, 308.2, 0.35, 0.98, 134.0, base, "Clears the worst states and waits out the close short circuit."
        ),
        stage(
            UNDER,
            1,
            177.1,
            1.5,
            1.03,
            77.0,
            base,
            "Below class-3 dips of 80 %, longer than the start of the largest motor.",
        ),
        r.StageResult(
            off,
            None,
            base,
            None,
            "",
            0.0,
            0.0,
            0.0,
            True,
            (),
            None,
            None,
            "adds no state to what the other stages clear",
        ),
        stage(
            SHIFT,
            1,
            21.5,
            0.7,
            0.95,
            9.348,
            base,
            "Lowest settable pickup above the standing displacement with error and reserve.",
        ),
        stage(SHIFT, 2, 88.0, 0.08, 0.95, 38.261, base, "Fast where no must-hold case displaces the neutral so far."),
    )


def cases() -> tuple[r.CaseResult, ...]:
    rows = (
        ("supply at its upper limit, least load", 253.0, 251.0, 1.2, None, "253 V for ever"),
        ("supply at its lower limit, full load", 199.0, 195.5, 1.9, None, "195.5 V for ever"),
        ("declared unbalance and displacement", 248.0, 221.0, 9.6, None, "V2 2 %, V0 1 %"),
        ("supply swell 115 %", 264.5, 264.5, 1.2, 2.1, "115 % for 2 s"),
        ("supply swell 120 %", 276.0, 276.0, 1.2, 1.0, "120 % for 1 s"),
        ("dip on three lines", 92.0, 92.0, 0.4, 1.3, "40 % for 0.2 s"),
        ("dip on one line", 230.0, 92.0, 46.0, 0.5, "40 % for 0.2 s"),
        ("dip on one line", 230.0, 161.0, 23.0, 0.2, "70 % for 0.5 s"),
        ("start of the lift motor", 228.0, 203.0, 3.1, None, "dip to 88 % for 2.5 s"),
        ("short interruption", 0.0, 0.0, 0.0, 1.2, "0 V for 0.3 s"),
        ("line-to-neutral short circuit behind Workshop", 318.0, 11.0, 162.0, 0.03, "bolted, cleared in 0.05 s"),
        ("lost line", 230.0, 0.0, 76.7, None, "0/230/230 V"),
    )
    return tuple(
        r.CaseResult(
            k,
            name,
            "either" if name == "lost line" else "hold",
            "trip" if name == "lost line" else "hold",
            True,
            figures,
            ("EN 50160", "IEC 61000-4-11, class 3", "network")[k % 3],
            ("memory", "read", "computed")[k % 3],
            (r.Operated("59N stage 1", 0.75, ""), r.Operated("27 stage 1", 1.55, "line L1"))
            if name == "lost line"
            else (),
            high,
            low,
            v0,
            4.1 + k / 3,
            seconds,
            "59 stage 1",
            "27 stage 1" if seconds else "",
        )
        for k, (name, high, low, v0, seconds, figures) in enumerate(rows, 1)
    )


def summary(at: str, conductor: str, seen: bool, why: str, names: tuple[str, ...]) -> b.PlaceSummary:
    sights = tuple(
        b.ElementSight(f, share(c), t) for f, c, t in ((OVER, 301, 0.35), (UNDER, 122, 1.5), (SHIFT, 371, 0.08))
    )
    classes = {
        "high volts / in time": share(212),
        "both / in time": share(81),
        "none / in time": share(78),
        "none / none": share(29),
    }
    return b.PlaceSummary(
        at,
        conductor,
        seen,
        why,
        400,
        3 if seen else 0,
        {"above band": 12},
        classes if seen else {"high volts / none": share(91), "none / none": share(309)},
        share(293),
        share(29) if seen else share(309),
        (
            b.Percentiles("highest L-N of any board", "V", 233.0, 271.4, 327.9, 361.2),
            b.Percentiles("V0 at the relay", "V", 3.0, 61.2, 119.0, 151.3),
        ),
        (b.WorstState(112, names[-1], "L2", 361.2, 7), b.WorstState(309, names[0], "L3", 358.0, 9)),
        sights if seen else (),
        names,
        () if seen else ("Main board",),
        () if seen else (names[-1],),
        151.3 if conductor == "PEN" else None,
    )


def corridors() -> tuple[r.Corridor, ...]:
    def steps(*rows: tuple[float, float | None, str]) -> tuple[r.CurveStep, ...]:
        return tuple(r.CurveStep(*row) for row in rows)

    def dots(*rows: tuple[float, float | None, int, str]) -> tuple[r.CurveStep, ...]:
        return tuple(r.CurveStep(v, t, f"case {n}, {name}", n) for v, t, n, name in rows)

    over = r.Corridor(
        OVER,
        "V",
        steps(
            (254.0, None, "case 1"),
            (261.0, 2.02, "case 4"),
            (270.0, 1.02, "case 5"),
            (281.0, 0.07, "case 11"),
            (322.0, 0.0, "nothing"),
        ),
        steps(
            (258.0, 14.85, "break at Main board"),
            (278.0, 2.85, "break at Main board"),
            (303.0, 0.6, "break at source"),
            (354.0, 0.06, "break at source"),
        ),
        dots(
            (253.0, None, 1, "supply at its upper limit"),
            (264.5, 2.0, 4, "swell 115 %"),
            (276.0, 1.0, 5, "swell 120 %"),
            (318.0, 0.05, 11, "short circuit"),
            (317.5, 0.051, 12, "short circuit, near"),
        ),
        253.0,
        "case 1, supply at its upper limit",
    )
    under = r.Corridor(
        UNDER,
        "V",
        steps((200.0, None, "case 2"), (190.0, 2.6, "case 9"), (180.0, 0.6, "case 8"), (150.0, 0.32, "case 10")),
        steps((172.0, 9.8, "break at Workshop"), (148.0, 1.9, "break at source")),
        dots(
            (195.5, None, 2, "supply at its lower limit"),
            (203.0, 2.5, 9, "lift motor"),
            (161.0, 0.5, 8, "dip"),
            (92.0, 0.2, 6, "dip"),
            (92.0, 0.2, 7, "dip"),
            (0.0, 0.3, 10, "interruption"),
        ),
        195.5,
        "case 2, supply at its lower limit",
    )
    shift = r.Corridor(
        SHIFT,
        "V",
        steps((12.0, None, "case 3"), (16.0, 0.52, "case 8"), (26.0, 0.22, "case 7"), (50.0, 0.06, "case 11")),
        steps((21.0, 14.8, "break at Main board"), (60.0, 2.8, "break at Main board"), (110.0, 0.6, "break at source")),
        dots(
            (9.6, None, 3, "unbalance"),
            (23.0, 0.5, 8, "dip"),
            (46.0, 0.2, 7, "dip"),
            (162.0, 0.05, 11, "short circuit"),
        ),
        9.6,
        "case 3, declared unbalance",
    )
    return over, under, shift


def tests() -> tuple[r.TestPoint, ...]:
    return (
        r.TestPoint(
            "59 stage 1",
            "L1",
            "230 V, then ramp 0.5 V/s upward",
            "pickup",
            263.3,
            268.7,
            "V",
            "59 stage 2 off or delay watched on its own output",
        ),
        r.TestPoint(
            "59 stage 1",
            "L1",
            "step 230 to 272 V",
            "trip after delay",
            4.06,
            4.14,
            "s",
            "59N stays below 21.5 V: raise all lines",
        ),
        r.TestPoint(
            "27 stage 1",
            "L2",
            "230 V, then ramp 0.5 V/s downward",
            "pickup",
            175.2,
            178.8,
            "V",
            "start-up inhibit elapsed",
        ),
        r.TestPoint(
            "59N stage 1",
            "all",
            "L1 up, L2 and L3 unchanged",
            "pickup of V0",
            21.2,
            21.8,
            "V",
            "59 stage 1 below its pickup",
        ),
        r.TestPoint("59N stage 2", "all", "step of V0 to 95 V", "trip after delay", 0.06, 0.1, "s", "none"),
    )


def findings(exceptions: int) -> tuple[r.Finding, ...]:
    return (
        *(
            r.Finding(
                "exception",
                f"break at place {k}",
                "2.1 % of the harmful states are cleared late at Workshop: the second stage waits for the swell.",
                "add a fourth stage or state the site's own swell record",
                "equipment may be damaged in these states",
            )
            for k in range(1, exceptions + 1)
        ),
        r.Finding(
            "warning",
            "shunt coil",
            "L2-L3 falls to 260 V in one state, below the coil's 280 V.",
            "feed the coil from a buffered supply",
            "the trip may fail",
        ),
        r.Finding("note", "47", "The device has no unbalance element.", "nothing", "nothing"),
    )


def study(paper: str = "A4", boards: int = 3, exceptions: int = 0, inputs: int = 60) -> r.Study:
    site = the_site(paper, boards, inputs)
    names = tuple(b.name for b in site.boards)
    hidden = "the break is downstream of the relay's measuring point"
    places = (
        summary("source", "PEN", True, "", names),
        summary(names[0], "PEN", True, "", names),
        *(summary(name, "N", False, hidden, (name,)) for name in names[1:]),
    )
    y = (10 / 230 + 0j, 5 / 230 + 0j, 3 / 230 + 0j)
    emf = [230 * cmath.exp(-2j * math.pi * k / 3) for k in range(3)]
    shift = sum(e * a for e, a in zip(emf, y, strict=True)) / sum(y)
    volts = tuple(abs(e - shift) for e in emf)
    spread = [cmath.rect(3.1 * k % 150, 2.4 * k) for k in range(1, 160)]
    plane = tuple(
        r.PlanePoint(
            v, "none" if abs(v) < 40 else "high volts", "none" if abs(v) < 22 else "late" if abs(v) > 143 else "in time"
        )
        for v in spread
    )
    marks = stages()
    settings = Settings("K1", "Test relay type VR-4", DIGEST, tuple(m.stage for m in marks), 0.5, "by hand")
    return r.Study(
        site=site,
        device=device(),
        kind="derive",
        seed=20,
        samples=400,
        settings=settings,
        stages=marks,
        cases=cases(),
        breaks=b.BreakStudy((), places, 2, len(places), ("Third harmonic was not part of the sampled states.",)),
        corridors=corridors(),
        closed=(
            r.ClosedGroup(
                {"59": "case 5, swell 120 %", "27": "case 10, interruption"},
                9,
                False,
                "Main board",
                277.0,
                3.2,
                0.4,
                "States between 270 and 277 V look like the swell to 59; nothing but time tells them apart.",
            ),
        ),
        uncleared=23,
        blocked=9,
        findings=findings(exceptions),
        tests=tests(),
        worked=r.WorkedBreak("Main board", "connected", y, 0j, 230.0, shift, volts, tuple(v + 0.04 for v in volts)),
        plane=plane,
        displacement_standing_v=9.6,
        feed_range_v=(("relay supply L1-L2", 396.0, 401.0), ("trip coil L2-L3", 260.0, 402.0)),
        smallest_asymmetry={"59": 2.2, "59 + 27": 1.9, "all": 1.33, "47": None},
        coverage=(
            r.Cover("59", 82.4, 69.5),
            r.Cover("27", None, 25.6),
            r.Cover("all", 97.2, 83.7),
            r.Cover("all, as supply and coil are fed", 41.5, 37.3),
        ),
        input_digest=DIGEST,
    )


def checked(exceptions: int = 2) -> r.Study:
    """Existing settings that reconnect by themselves, with exceptions against them."""
    found = study(exceptions=exceptions)
    settings = replace(found.settings, after_any_trip="automatic", reconnect_delay_s=60.0)
    return replace(found, kind="check", settings=settings)


def with_title(study: r.Study, title: str) -> r.Study:
    """The same study under another title."""
    return replace(study, site=replace(study.site, document=replace(study.site.document, title=title)))
