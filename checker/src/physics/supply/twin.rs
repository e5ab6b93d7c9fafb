//! The same rail by small steps: what every shortcut of the supply is held against in tests.
//! Must not share a formula with what it checks: it knows Kirchhoff's laws and Runge-Kutta only.

/// A rail in plain SI units.
#[derive(Clone, Copy, Debug)]
pub(super) struct Twin {
    pub(super) crest: f64,
    pub(super) drop: f64,
    pub(super) source: f64,
    pub(super) esr: f64,
    pub(super) reservoir: f64,
    pub(super) omega: f64,
}

impl Twin {
    /// Charging current and terminal voltage at a time, for a voltage `u` inside the capacitor.
    fn at(&self, load: f64, time: f64, u: f64) -> (f64, f64) {
        let source = self.crest * libm::sin(self.omega * time).abs() - self.drop;
        let charging = ((source - u + self.esr * load) / (self.source + self.esr)).max(0.0);
        (charging, u + self.esr * (charging - load))
    }

    /// `count` steps of `h` from `start` (time, voltage inside), fourth-order Runge-Kutta; `visit`
    /// gets time, terminal voltage and charging current before each step. Returns the voltage inside.
    pub(super) fn march(
        &self,
        load: &impl Fn(f64) -> f64,
        start: (f64, f64),
        h: f64,
        count: usize,
        mut visit: impl FnMut(f64, f64, f64),
    ) -> f64 {
        let rate = |time: f64, u: f64| {
            let drawn = load(time);
            (self.at(drawn, time, u).0 - drawn) / self.reservoir
        };
        let mut u = start.1;
        for n in 0..count {
            let time = start.0 + h * n as f64;
            let (charging, terminal) = self.at(load(time), time, u);
            visit(time, terminal, charging);
            let k1 = rate(time, u);
            let k2 = rate(time + h / 2.0, u + h / 2.0 * k1);
            let k3 = rate(time + h / 2.0, u + h / 2.0 * k2);
            let k4 = rate(time + h, u + h * k3);
            u += h / 6.0 * (k1 + 2.0 * k2 + 2.0 * k3 + k4);
        }
        u
    }
}
