//! Node factors f and node angles u.
//!
//! **Source**: P. Schureman (1940), Special Publication 98, equations 73 to 78, 149, 197, 206, 213 to
//! 215, 224, 227, 232 and 235 (from memory, confirmed in use against published predictions).

use libm::{acos, atan2, cos, sin, sqrt, tan};

use crate::arguments::Arguments;

/// Amplitude factor and phase angle of one term.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct NodeFactor {
    pub f: f64,
    pub u_deg: f64,
}

impl NodeFactor {
    pub(crate) const ONE: Self = Self { f: 1.0, u_deg: 0.0 };
}

/// The terms that node rules are made of.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) enum Term {
    Mm,
    Mf,
    O1,
    J1,
    Oo1,
    M2,
    M3,
    K1,
    K2,
    M1,
    L2,
}

impl Term {
    pub(crate) fn named(name: &str) -> Option<Self> {
        Some(match name {
            "Mm" => Self::Mm,
            "Mf" => Self::Mf,
            "O1" => Self::O1,
            "J1" => Self::J1,
            "OO1" => Self::Oo1,
            "M2" => Self::M2,
            "M3" => Self::M3,
            "K1" => Self::K1,
            "K2" => Self::K2,
            "M1" => Self::M1,
            "L2" => Self::L2,
            _ => return None,
        })
    }
}

/// The lunar orbit's inclination to the equator and the angles that follow, radians.
struct Orbit {
    i: f64,
    xi: f64,
    nu: f64,
    nu_prime: f64,
    nu_second_2: f64,
    /// Longitude of the perigee from the lunar intersection, p - xi.
    p: f64,
}

/// Obliquity of 1900, 23 deg 27' 8.26", and inclination of the lunar orbit, 5 deg 8' 43.3546".
const OBLIQUITY_DEG: f64 = 23.0 + 27.0 / 60.0 + 8.26 / 3600.0;
const INCLINATION_DEG: f64 = 5.0 + 8.0 / 60.0 + 43.3546 / 3600.0;

impl Orbit {
    fn at(a: &Arguments) -> Self {
        let (omega, incl) = (OBLIQUITY_DEG.to_radians(), INCLINATION_DEG.to_radians());
        // Into (-180, 180], so that half angles keep their quadrant.
        let n_deg = a.n_deg - 360.0 * (a.n_deg / 360.0).round();
        let n = n_deg.to_radians();
        let i = acos(cos(incl) * cos(omega) - sin(incl) * sin(omega) * cos(n));
        let (half_sin, half_cos) = (sin(n / 2.0), cos(n / 2.0));
        let (less, more) = ((omega - incl) / 2.0, (omega + incl) / 2.0);
        let a1 = atan2(cos(less) / cos(more) * half_sin, half_cos);
        let a2 = atan2(sin(less) / sin(more) * half_sin, half_cos);
        let (nu, xi) = (a1 - a2, n - a1 - a2);
        let (s2i, si) = (sin(2.0 * i), sin(i));
        let nu_prime = atan2(s2i * sin(nu), s2i * cos(nu) + 0.3347);
        let nu_second_2 = atan2(si * si * sin(2.0 * nu), si * si * cos(2.0 * nu) + 0.0727);
        Self { i, xi, nu, nu_prime, nu_second_2, p: a.p_deg.to_radians() - xi }
    }

    fn factor(&self, term: Term) -> (f64, f64) {
        let Self { i, xi, nu, .. } = *self;
        let (si, ch, sh) = (sin(i), cos(i / 2.0), sin(i / 2.0));
        let s2i = sin(2.0 * i);
        match term {
            Term::Mm => ((2.0 / 3.0 - si * si) / 0.5021, 0.0),
            Term::Mf => (si * si / 0.1578, -2.0 * xi),
            Term::O1 => (si * ch * ch / 0.3800, 2.0 * xi - nu),
            Term::J1 => (s2i / 0.7214, -nu),
            Term::Oo1 => (si * sh * sh / 0.0164, -2.0 * xi - nu),
            Term::M2 => (ch * ch * ch * ch / 0.9154, 2.0 * xi - 2.0 * nu),
            Term::M3 => (ch * ch * ch * ch * ch * ch / 0.8758, 3.0 * xi - 3.0 * nu),
            Term::K1 => {
                let f2 = 0.8965 * s2i * s2i + 0.6001 * s2i * cos(nu) + 0.1006;
                (sqrt(f2), -self.nu_prime)
            }
            Term::K2 => {
                let s2 = si * si;
                let f2 = 19.0444 * s2 * s2 + 2.7702 * s2 * cos(2.0 * nu) + 0.0981;
                (sqrt(f2), -self.nu_second_2)
            }
            Term::M1 => self.m1(),
            Term::L2 => self.l2(),
        }
    }

    fn m1(&self) -> (f64, f64) {
        let (f_o1, _) = self.factor(Term::O1);
        let (ci, ch) = (cos(self.i), cos(self.i / 2.0));
        let (c2, q) = (ch * ch, cos(2.0 * self.p));
        let f = f_o1 * sqrt(0.25 + 1.5 * ci * q / c2 + 2.25 * ci * ci / (c2 * c2));
        // Q lies in the quadrant of P.
        let angle = atan2((5.0 * ci - 1.0) * sin(self.p), (7.0 * ci + 1.0) * cos(self.p));
        (f, -self.nu - (self.p - angle))
    }

    fn l2(&self) -> (f64, f64) {
        let (f_m2, u_m2) = self.factor(Term::M2);
        let th = tan(self.i / 2.0);
        let (t2, c2p) = (th * th, cos(2.0 * self.p));
        let f = f_m2 * sqrt(1.0 - 12.0 * t2 * c2p + 36.0 * t2 * t2);
        let r = atan2(sin(2.0 * self.p), 1.0 / (6.0 * t2) - c2p);
        (f, u_m2 - r)
    }
}

/// f and u of every fundamental term at once.
pub(crate) struct Nodes {
    orbit: Orbit,
}

impl Nodes {
    pub(crate) fn at(a: &Arguments) -> Self {
        Self { orbit: Orbit::at(a) }
    }
    pub(crate) fn of(&self, term: Term) -> NodeFactor {
        let (f, u) = self.orbit.factor(term);
        let u_deg = u.to_degrees();
        NodeFactor { f, u_deg: u_deg - 360.0 * (u_deg / 360.0).round() }
    }
    /// A compound: f to the power of |coefficient|, u by coefficient.
    pub(crate) fn compound(&self, terms: &[(Term, i32)]) -> NodeFactor {
        terms.iter().fold(NodeFactor::ONE, |product, (term, coefficient)| {
            let one = self.of(*term);
            let f = (0..coefficient.abs()).fold(product.f, |f, _| f * one.f);
            NodeFactor { f, u_deg: product.u_deg + f64::from(*coefficient) * one.u_deg }
        })
    }
}

/// f and u of a constituent by name (e.g. `K1`, `MS4`) at an instant; `None` if it is not in the
/// table. `u` is not brought into a circle for compounds.
pub fn node_factor(name: &str, at: units::Utc) -> Option<NodeFactor> {
    let row = crate::table::find(name)?;
    Some(Nodes::at(&crate::arguments(at)).compound(&row.nodes))
}
