"""Compensators of type I, II and III around an op amp or a transconductance amplifier: two independent hand-written forms.

`Network.at` solves the nodal equations in admittances at one frequency; `Network.state_space` writes the same circuit as
first-order equations of its capacitor voltages.  The regenerating script compares the two.

Circuit: upper divider resistor from the output to the inverting input (type III: r3 in series with c3 across it;
optional cff across it), lower resistor to ground.  Op amp: c1 in series with r2, all across c2, from the control voltage back
to the inverting input (type I: c1 alone).  Transconductance amplifier: the same network from the control voltage to ground.
Op amp: A(s) = A0 / (1 + s A0 / (2 pi GBW)).  Conventions: SI; the response is -vc/vout, the inversion taken out.
"""

from dataclasses import dataclass

import numpy as np


@dataclass
class Network:
    """Parts of one compensator; zero means not fitted."""

    kind: int  # 1, 2 or 3
    amplifier: str  # "op-amp" or "transconductance"
    reference: float  # [V]
    upper: float  # [ohm]
    lower: float  # [ohm]
    c1: float
    r2: float = 0.0
    c2: float = 0.0
    r3: float = 0.0
    c3: float = 0.0
    cff: float = 0.0
    gain: float = 0.0  # op amp: A0, transconductance: gm [S]
    limit: float = 0.0  # op amp: GBW [Hz], transconductance: output resistance [ohm]
    ideal: bool = False  # op amp with infinite gain / transconductance amplifier with infinite output resistance

    def at(self, s):
        """(-vc/vout, vc/vref) at the complex frequency s (one or many), from the node equations."""
        upper = 1.0 / self.upper + s * self.cff
        if self.kind == 3:
            upper += 1.0 / (self.r3 + 1.0 / (s * self.c3))
        lower = 1.0 / self.lower
        network = s * self.c1 if self.kind == 1 else 1.0 / (self.r2 + 1.0 / (s * self.c1)) + s * self.c2
        total = upper + lower
        if self.amplifier == "op-amp":
            # Node of the inverting input: (vout - v) upper + (vc - v) network = v lower, with vc = A (vref - v).
            if self.ideal:
                return upper / network, (total + network) / network
            a = self.gain / (1.0 + s * self.gain / (2.0 * np.pi * self.limit))
            below = total + network + a * network
            return a * upper / below, a * (total + network) / below
        z = 1.0 / (network + (0.0 if self.ideal else 1.0 / self.limit))
        return self.gain * z * upper / total, self.gain * z

    def state_space(self):
        """(A, B, C, names) with inputs (vout, vref) and the single output vc; amplifier limits included."""
        opamp = self.amplifier == "op-amp"
        # With cff beside an op amp the output would have to be differentiated; not needed by the designs here.
        assert not (opamp and self.cff) and not self.ideal and self.kind in (2, 3) and self.c2 > 0.0
        names = ["vc", "v1"] + (["v2"] if opamp else []) + (["v3"] if self.kind == 3 else [])
        names += ["vff"] if self.cff else []
        columns = names + ["vout", "vref"]

        def row(name):
            return np.array([1.0 if column == name else 0.0 for column in columns])

        vc, v1, vout, vref = row("vc"), row("v1"), row("vout"), row("vref")
        slopes = {}
        if opamp:
            v_node = row("v2") + vc  # c2 lies from the inverting input to the control voltage
            current = (vout - v_node) / self.upper
            if self.kind == 3:
                i3 = (vout - v_node - row("v3")) / self.r3
                slopes["v3"] = i3 / self.c3
                current = current + i3
            i1 = (row("v2") - v1) / self.r2
            slopes["v1"] = i1 / self.c1
            slopes["v2"] = (current - v_node / self.lower - i1) / self.c2
            omega = 2.0 * np.pi * self.limit / self.gain
            slopes["vc"] = omega * (self.gain * (vref - v_node) - vc)
        else:
            if self.cff:
                assert self.kind == 2
                v_fb = vout - row("vff")
                slopes["vff"] = (v_fb / self.lower - row("vff") / self.upper) / self.cff
            elif self.kind == 3:
                g_u, g_3, g_l = 1.0 / self.upper, 1.0 / self.r3, 1.0 / self.lower
                v_fb = ((g_u + g_3) * vout - g_3 * row("v3")) / (g_u + g_3 + g_l)
                slopes["v3"] = (vout - v_fb - row("v3")) / (self.r3 * self.c3)
            else:
                v_fb = vout * self.lower / (self.upper + self.lower)
            i1 = (vc - v1) / self.r2
            slopes["v1"] = i1 / self.c1
            slopes["vc"] = (self.gain * (vref - v_fb) - vc / self.limit - i1) / self.c2
        n = len(names)
        ab = np.array([slopes[name] for name in names])
        return ab[:, :n], ab[:, n:], row("vc")[:n], names
