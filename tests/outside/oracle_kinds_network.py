"""The network of a stage of one of oracle_kinds.py's kinds: nodes, elements, amplifiers, by the kinds' documentation."""
BOLTZMANN, CHARGE = 1.380649e-23, 1.602176634e-19
DIFFERENTIAL = ("difference", "instrumentation")


class Network:
    """Nodes and elements of a stage. Wires merge nodes; node "0" is ground."""

    def __init__(self, c, load=True, open_input=False, acquiring=False):
        self.c, self.parent, self.r, self.cap, self.amps = c, {}, [], [], []
        kind, comp = c["kind"], c["components"]
        self.inputs = {"summing": sum(f"Rin{i}" in comp for i in range(1, 9)), "difference": 2, "instrumentation": 2, "scale-and-shift": 2,
                       "ac-non-inverting": 2, "ac-inverting": 2}.get(kind, 1)
        self.drive = {"transimpedance": "current", "charge": "charge"}.get(kind, "voltage")
        for i in range(self.inputs):
            # The impedance that the first source sees leaves out its own, and no other's.
            source = None if open_input and i == 0 else (c["sources"] + [None] * 8)[i]
            self.source(i, source or {})
        if c["reference"] and kind == "scale-and-shift":
            self.res("reference_resistance", "s1", "ref", c["reference"])
        else:
            self.wire("s1", "ref")
        # Behind the stage's output a converter may stand; what the stage is judged by is then its input.
        converter = c.get("around", {}).get("converter")
        end = "end" if load and converter and "series_resistance" in converter else "out"
        tap = end if c["isolation"] == "inside" else "pin"

        def place(name, a, b):
            """A component where the stage has it; says whether it does."""
            if name in comp:
                (self.res if name[0] == "R" else lambda n, x, y, v: self.capacitor(x, y, v))(name, a, b, comp[name])
            return name in comp

        def series(resistor, capacitor, a, b):
            if resistor in comp and capacitor in comp:
                self.res(resistor, a, resistor + "-" + capacitor, comp[resistor])
                self.capacitor(resistor + "-" + capacitor, b, comp[capacitor])

        place("Riso", "pin", end) or self.wire("pin", end)
        if load and converter:
            if end != "out":
                self.res("converter_series", end, "out", converter["series_resistance"])
            self.capacitor("out", "0", converter.get("shunt_capacitance", 0.0))
            if acquiring:
                if "switch_resistance" in converter:
                    self.res(None, "out", "hold", converter["switch_resistance"])
                else:
                    self.wire("out", "hold")
                self.capacitor("hold", "0", converter["sample_capacitance"])
        series("Rsn", "Csn", "pin", "0")
        getattr(self, "lay_" + kind.replace("-", "_"))(place, series, tap)
        if kind in ("inverting", "summing", "transimpedance", "charge", "integrator", "differentiator", "multiple-feedback-low-pass", "multiple-feedback-band-pass"):
            place("Rp", "p", "0") or self.wire("p", "0")
            if "Rp" in comp:
                place("Cp", "p", "0")
        if kind == "instrumentation":
            self.amps = [("t0", "m1", "o1"), ("t1", "m2", "o2"), ("p", "n", "pin")]
        else:
            self.amps = [("p", "n", "pin")]
        for k, (p, n, pin) in enumerate(self.amps):
            amp = c["amplifiers"][min(k, len(c["amplifiers"]) - 1)]
            self.capacitor(p, n, amp["differential_capacitance"])
            self.capacitor(p, "0", amp["common_mode_capacitance"])
            self.capacitor(n, "0", amp["common_mode_capacitance"])
            for a, b, name in ((p, n, "differential_resistance"), (p, "0", "common_mode_resistance"), (n, "0", "common_mode_resistance")):
                if amp[name]:
                    self.res(None, a, b, amp[name])
            if amp["output_resistance"]:
                self.res(None, f"e{k}", pin, amp["output_resistance"])
            else:
                self.wire(f"e{k}", pin)
        p, n, pin = self.amps[0]
        for name, a, b in (("inverting_node", n, "0"), ("non_inverting_node", p, "0"), ("across_feedback", pin, n)):
            self.capacitor(a, b, c["board"].get(name, 0.0))
        if load:
            if c["load"].get("resistance"):
                self.res("load_resistance", end, "0", c["load"]["resistance"])
            self.capacitor(end, "0", c["load"].get("capacitance", 0.0))

        # Voltages hold their nodes by a branch current each; the first input's is left out to look into it.
        self.held = [i for i in range(self.inputs) if self.drive == "voltage" and not (open_input and i == 0)]
        names = ["out"] + [x for el in self.r for x in el[1:3]] + [x for el in self.cap for x in el[:2]]
        names += [x for amp in self.amps for x in amp] + [f"s{i}" for i in range(self.inputs)]
        self.index = {}
        for x in names:
            at = self.find(x)
            if at != self.find("0") and at not in self.index:
                self.index[at] = len(self.index)
        self.nodes = len(self.index)
        self.branch = {("e", k): self.nodes + k for k in range(len(self.amps))}
        self.branch |= {("s", i): self.nodes + len(self.amps) + j for j, i in enumerate(self.held)}
        self.size = self.nodes + len(self.branch)

    def source(self, i, source):
        s, t = f"s{i}", f"t{i}"
        if self.drive == "voltage":
            if source.get("resistance"):
                self.res(f"source_resistance_{i}", s, t, source["resistance"])
            elif source.get("capacitance"):
                self.capacitor(s, t, source["capacitance"])
            else:
                self.wire(s, t)
            return
        self.wire(s, t)
        self.capacitor(t, "0", source.get("capacitance", 0.0))
        for name in ("resistance", "shunt_resistance"):
            if source.get(name):
                self.res(f"source_resistance_{i}", t, "0", source[name])

    # Each kind by its documentation: which component joins what.
    def input_filter(self, place, to="p"):
        place("Rser", "t0", to) or self.wire("t0", to)
        place("Cshunt", to, "0")

    def lay_follower(self, place, series, tap):
        self.input_filter(place)
        place("Rf", tap, "n") or self.wire(tap, "n")
        place("Cf", "pin", "n")
        series("Rng", "Cng", "p", "n")

    def lay_non_inverting(self, place, series, tap):
        self.input_filter(place)
        place("Rg", "n", "0")
        place("Rf", tap, "n")
        place("Cf", "pin", "n")
        series("Rng", "Cng", "p", "n")

    def lay_inverting(self, place, series, tap):
        self.input_filter(place, "b")
        place("Rin", "b", "n")
        place("Rf", tap, "n")
        place("Cf", "pin", "n")
        series("Rng", "Cng", "p", "n")

    def lay_summing(self, place, series, tap):
        for i in range(self.inputs):
            place(f"Rin{i + 1}", f"t{i}", "n")
        place("Rf", tap, "n")
        place("Cf", "pin", "n")
        series("Rng", "Cng", "p", "n")

    def lay_difference(self, place, series, tap):
        for name, a, b in (("R1", "t0", "n"), ("R2", tap, "n"), ("R3", "t1", "p"), ("R4", "p", "0"), ("C2", "pin", "n"), ("C4", "p", "0")):
            place(name, a, b)
        series("Rng", "Cng", "p", "n")

    def lay_instrumentation(self, place, series, tap):
        for name, a, b in (("Rg", "m1", "m2"), ("Rf1", "o1", "m1"), ("Rf2", "o2", "m2"), ("R1", "o1", "n"), ("R2", tap, "n"), ("R3", "o2", "p"),
                           ("R4", "p", "0"), ("C2", "pin", "n"), ("C4", "p", "0")):
            place(name, a, b)

    def lay_transimpedance(self, place, series, tap):
        self.wire("t0", "n")
        place("Rf", tap, "n")
        place("Cf", "pin", "n")
        series("Rng", "Cng", "p", "n")

    def lay_charge(self, place, series, tap):
        place("Rser", "t0", "n") or self.wire("t0", "n")
        place("Rf", tap, "n")
        place("Cf", "pin", "n")
        series("Rng", "Cng", "p", "n")

    def lay_integrator(self, place, series, tap):
        place("Rin", "t0", "n")
        place("Rf", tap, "n")
        place("Cf", "pin", "n")
        series("Rng", "Cng", "p", "n")

    def lay_differentiator(self, place, series, tap):
        place("Rin", "t0", "m") or self.wire("t0", "m")
        place("Cin", "m", "n")
        place("Rf", tap, "n")
        place("Cf", "pin", "n")
        series("Rng", "Cng", "p", "n")

    def lay_scale_and_shift(self, place, series, tap):
        for name, a, b in (("R1", "t0", "p"), ("R2", "ref", "p"), ("Cshunt", "p", "0"), ("Rg", "n", "0"), ("Rf", tap, "n"), ("Cf", "pin", "n")):
            place(name, a, b)
        series("Rng", "Cng", "p", "n")

    def lay_ac_non_inverting(self, place, series, tap):
        for name, a, b in (("Rb1", "s1", "d"), ("Rb2", "d", "0"), ("Cb", "d", "0"), ("Rb", "d", "p"), ("Cin", "t0", "p"), ("Rf", tap, "n"),
                           ("Cf", "pin", "n")):
            place(name, a, b)
        series("Rg", "Cg", "n", "0")

    def lay_ac_inverting(self, place, series, tap):
        for name, a, b in (("Rb1", "s1", "p"), ("Rb2", "p", "0"), ("Cb", "p", "0"), ("Rf", tap, "n"), ("Cf", "pin", "n")):
            place(name, a, b)
        series("Rin", "Cin", "t0", "n")

    def gain_pair(self, place, tap):
        if place("Rf", tap, "n"):
            place("Rg", "n", "0")
        else:
            self.wire(tap, "n")

    def lay_sallen_key_low_pass(self, place, series, tap):
        for name, a, b in (("R1", "t0", "a"), ("R2", "a", "p"), ("C1", "a", tap), ("C2", "p", "0")):
            place(name, a, b)
        self.gain_pair(place, tap)

    def lay_sallen_key_high_pass(self, place, series, tap):
        for name, a, b in (("C1", "t0", "a"), ("C2", "a", "p"), ("R1", "a", tap), ("R2", "p", "0")):
            place(name, a, b)
        self.gain_pair(place, tap)

    def lay_multiple_feedback_low_pass(self, place, series, tap):
        for name, a, b in (("R1", "t0", "a"), ("C1", "a", "0"), ("R3", "a", "n"), ("R2", "a", tap), ("C2", "pin", "n")):
            place(name, a, b)
        series("Rng", "Cng", "p", "n")

    def lay_multiple_feedback_band_pass(self, place, series, tap):
        for name, a, b in (("R1", "t0", "a"), ("R2", "a", "0"), ("C2", "a", "n"), ("R3", tap, "n"), ("C1", "a", tap)):
            place(name, a, b)
        series("Rng", "Cng", "p", "n")

    def find(self, x):
        while self.parent.get(x, x) != x:
            x = self.parent[x]
        return x

    def wire(self, a, b):
        a, b = self.find(a), self.find(b)
        if a != b:
            if b == "0":
                a, b = b, a
            self.parent[b] = a

    def res(self, name, a, b, ohms):
        self.r.append((name, a, b, ohms))

    def capacitor(self, a, b, farads):
        if farads:
            self.cap.append((a, b, farads))

    def at(self, x):
        """Row of a node, None for ground."""
        return self.index.get(self.find(x))

    def stamp(self, number):
        """Lists of (row, column, value) for conductances and capacitances; `number` makes exact values."""
        g, c = [], []

        def two(into, a, b, y):
            a, b = self.at(a), self.at(b)
            if a != b:
                for i, j, sign in ((a, a, 1), (b, b, 1), (a, b, -1), (b, a, -1)):
                    if i is not None and j is not None:
                        into.append((i, j, y if sign > 0 else -y))

        for _, a, b, ohms in self.r:
            two(g, a, b, 1 / number(ohms))
        for a, b, farads in self.cap:
            two(c, a, b, number(farads))
        for (sort, k), row in self.branch.items():
            node = self.at(f"{sort}{k}")
            g += [(node, row, number(1)), (row, node, number(1))]
        return g, c

    def difference(self, k):
        """Rows of v(p) - v(n) of an amplifier with their signs."""
        p, n, _ = self.amps[k]
        return [(i, sign) for i, sign in ((self.at(p), 1), (self.at(n), -1)) if i is not None]

    def drives(self):
        """What the stage is judged by: weights on its inputs."""
        if self.c["kind"] in DIFFERENTIAL:
            return [[(0, -0.5), (1, 0.5)], [(0, 1.0), (1, 1.0)]]
        return [[(i, 1.0)] for i in range(self.inputs)]

    def sources(self):
        """Noise sources: name, nodes or the amplifier in whose input the voltage stands, density."""
        c = self.c
        kt4 = 4 * BOLTZMANN * c["temperature"]
        list = [(name, self.at(a), self.at(b), None, lambda f, y=kt4 / ohms: y + 0 * f) for name, a, b, ohms in self.r if name]
        diode = (c["sources"] + [None])[0]
        if diode and "dark_current" in diode:
            # At the most light: the steady part and the peak of what stands on it.
            light = abs(c["signal_dc"]) + c.get("around", {}).get("signal", [0.0, 0.0])[1]
            shot = 2 * CHARGE * (diode["dark_current"] + light)
            list.append(("shot_0", self.at("t0"), None, None, lambda f: shot + 0 * f))
        for k, (p, n, _) in enumerate(self.amps):
            amp = c["amplifiers"][min(k, len(c["amplifiers"]) - 1)]
            current = lambda f, amp=amp: amp["current_noise"] ** 2 * (1 + amp["current_corner"] / f)
            voltage = lambda f, amp=amp: amp["voltage_noise"] ** 2 * (1 + (amp["voltage_corner"] / f) ** amp["exponent"])
            list += [(f"current_non_inverting_{k}", self.at(p), None, None, current), (f"current_inverting_{k}", self.at(n), None, None, current),
                     (f"voltage_{k}", None, None, k, voltage)]
        return list
