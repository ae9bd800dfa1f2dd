"""Computes the tables of this folder from the published equations that SOURCE.md names. Python 3,
standard library only, and no code in common with the program under test."""
import csv, math, os
G = 9.81
HERE = os.path.dirname(os.path.abspath(__file__))
TAB = HERE

def write(name, header, rows, comment=None):
    with open(os.path.join(TAB, name), "w", newline="") as f:
        if comment:
            for line in comment.strip().splitlines():
                f.write("# " + line.strip() + "\n")
        w = csv.writer(f, lineterminator="\n")
        w.writerow(header)
        for r in rows:
            w.writerow([fmt(v) for v in r])

def fmt(v):
    if isinstance(v, bool):
        return "true" if v else "false"
    if isinstance(v, float):
        if v != v:
            return ""
        return "%.9g" % v
    return v

def bisect(f, a, b, tol=1e-14, n=200):
    fa, fb = f(a), f(b)
    if fa == 0: return a
    if fb == 0: return b
    if fa * fb > 0:
        raise ValueError("no sign change %g %g" % (fa, fb))
    for _ in range(n):
        m = 0.5 * (a + b)
        fm = f(m)
        if fa * fm <= 0:
            b, fb = m, fm
        else:
            a, fa = m, fm
        if abs(b - a) <= tol * max(1.0, abs(m)):
            break
    return 0.5 * (a + b)


NU = 1.14e-6     # water 15 C
# ---- orifices --------------------------------------------------------------
rows = []
for b, a, r, dh in [(1., .5, 0., .05), (1., .5, 0., .2), (1., .5, .25, .2), (2., .8, .35, .1), (.6, .6, 0., .5), (1.5, 1., .5, .3)]:
    A = a * b; Cd = .61 * (1 + .15 * r); rows.append([b, a, r, dh, Cd, Cd * A * math.sqrt(2 * G * dh)])
write("st_submerged_orifice.csv", ["width_m", "height_m", "suppressed_perimeter_fraction", "head_diff_m", "Cd", "Q_m3_s"], rows, "Q = 0.61(1+0.15 r) A sqrt(2 g dh); approach velocity neglected")
rows = []
for A, h, Cd in [(.5, 1., .61), (.5, 2.5, .61), (.196349541, 1.5, .61), (1., .8, .8)]: rows.append([A, h, Cd, Cd * A * math.sqrt(2 * G * h)])
write("st_free_orifice.csv", ["area_m2", "head_to_centre_m", "Cd", "Q_m3_s"], rows, "Q = Cd A sqrt(2 g h); valid h > ~2 x opening height")
# ---- weirs -----------------------------------------------------------------
rows = []
for b, H, Cd in [(3., .3, 1.), (3., .5, .95), (5., 1., .95), (2., .2, .9)]: rows.append([b, H, Cd, Cd * 2 / 3 * math.sqrt(2 * G / 3) * b * H**1.5])
write("st_broad_crested_free.csv", ["b_m", "H1_energy_head_m", "Cd", "Q_m3_s"], rows, "Q = Cd (2/3) sqrt(2g/3) b H^1.5 = 1.7048 Cd b H^1.5")
rows = []
for S in (0., .2, .4, .5, .6, .7, .8, .9, .95, .98, .99, 1.): rows.append([S] + [(1 - S**n)**.385 for n in (1.5, 2.5, 1.44, 1.42)])
write("st_villemonte.csv", ["S=H2/H1", "factor_n1.5_rectangular", "factor_n2.5_vnotch90", "factor_n1.44", "factor_n1.42"], rows, "Q/Q1 = (1 - S^n)^0.385, n = exponent of the free-flow law; H2, H1 heads above crest")
# ---- pipes -----------------------------------------------------------------
def cole(Re, kD):
    if Re < 2000: return 64 / Re
    x = 8.
    for _ in range(200):
        n = -2 * math.log10(kD / 3.7 + 2.51 * x / Re)
        if abs(n - x) < 1e-14: break
        x = n
    return 1 / (n * n)
def sj(Re, kD): return .25 / math.log10(kD / 3.7 + 5.74 / Re**.9)**2
rows = []
for Re in (5e3, 1e4, 1e5, 5e5, 1e6, 1e7):
    for kD in (0., 1e-5, 1e-4, 1e-3, 5e-3, 1e-2): rows.append([Re, kD, cole(Re, kD), sj(Re, kD), (sj(Re, kD) / cole(Re, kD) - 1) * 100])
write("st_friction_factor.csv", ["Re", "k_over_D", "f_colebrook_white", "f_swamee_jain", "error_percent"], rows, "Darcy f. Swamee-Jain valid 5e3<=Re<=1e8, 1e-6<=k/D<=1e-2")
def loss(Q, L, D, k, K, nu=NU):
    A = math.pi * D * D / 4; V = Q / A
    return 0. if Q == 0 else (cole(V * D / nu, k / D) * L / D + K) * V * V / (2 * G)
rows = []
L, D, k, K = 800., .9, 1.5e-3, .5 + 1. + .6; rs, rf, zp = 1025., 1000., -8.
for chamber in (3., 4.5):
    for tide in (-2., -1., 0., 1., 2., 3.):
        dens = (rs / rf - 1) * (tide - zp)
        head = chamber - tide - dens
        Q = bisect(lambda q: loss(q, L, D, k, K) - head, 0., 10.) if head > 0 else 0.
        V = Q / (math.pi * D * D / 4)
        rows.append([chamber, tide, dens, head, Q, V, cole(V * D / NU, k / D) if Q else float("nan")])
write("st_gravity_outfall.csv", ["chamber_level_m", "tide_level_m", "density_head_m", "net_driving_head_m_freshwater", "Q_m3_s", "V_m_s", "f"], rows, "L=800 m D=0.9 m k=1.5 mm sum K=2.1 (entry .5, exit 1, bends .6), port centre -8.0 m, rho sea 1025, effluent 1000, nu 1.14e-6. Levels on one datum. No flow when head<=0 (flap shut).")
# ---- pumps -----------------------------------------------------------------
H0, Aq, Q0, eta0 = 14., 90., .22, .78      # H = H0 - Aq Q^2 ; eta = eta0 (1-((Q-Q0)/Q0)^2)
rows = []
Lp, Dp, kp, Kp = 60., .4, .6e-3, 3.5
sysK = lambda Q: loss(Q, Lp, Dp, kp, Kp)
for N in (1., .9, .8):
    for tide in (-1., 0., 1., 2., 3., 4., 5.):
        sump = -2.; st = max(tide, 1.) - sump       # discharges over a 1.0 m AOD soffit level when tide below it
        H = lambda Q: N * N * H0 - Aq * Q * Q
        if H(0) <= st: rows.append([N, tide, st, 0., float("nan"), float("nan"), float("nan"), float("nan")]); continue
        Q = bisect(lambda q: H(q) - st - sysK(q), 0., 1.); h = H(Q)
        eta = eta0 * (1 - ((Q / N - Q0) / Q0)**2); P = 1000 * G * Q * h / eta / 1000
        rows.append([N, tide, st, Q, h, eta, P, P / (Q * 3600) if Q else float("nan")])
write("st_pump_vs_tide.csv", ["speed_ratio", "tide_m", "static_head_m", "Q_m3_s", "H_m", "efficiency", "shaft_power_kW", "specific_energy_kWh_m3_excl_motor"], rows, "H=N^2*14-90Q^2, eta=0.78(1-((Q/N-0.22)/0.22)^2), sump -2.0, outlet soffit 1.0, rising main L=60 D=0.4 k=0.6mm K=3.5 nu=1.14e-6, rho=1000 g=9.81")
rows = []
for N in (1., .95, .9, .8, .7): rows.append([N, N * .25, N * N * 10, N**3 * 35.])
write("st_affinity.csv", ["speed_ratio", "Q_m3_s_from_0.25", "H_m_from_10", "P_kW_from_35"], rows)
rows = []
for Qp, starts in [(.05, 6), (.05, 10), (.1, 6), (.25, 6), (.25, 10), (.25, 15), (1., 4)]:
    T = 3600. / starts; V = T * Qp / 4; rows.append([Qp, starts, T, V, V / 2])
write("st_wet_well_volume.csv", ["Qp_m3_s", "max_starts_per_h", "T_min_s", "V_m3_single_duty", "V_m3_two_pumps_alternating"], rows, "V = T Qp / 4 (worst inflow Qp/2)")
rows = []; V, Qp = 22.5, .1
for f in (.05, .1, .25, .4, .5, .6, .75, .9, .95):
    q = f * Qp; t1, t2 = V / q, V / (Qp - q); rows.append([f, t1, t2, t1 + t2, 3600 / (t1 + t2)])
write("st_wet_well_cycle.csv", ["inflow_over_Qp", "fill_s", "pump_s", "cycle_s", "starts_per_h"], rows, "V=22.5 m3 (T=900 s, 4 starts/h), Qp=0.1 m3/s")
rows = []
for Q, H, e in [(.1, 5., .7), (.25, 8., .75), (1., 4., .8), (5., 3., .82)]: rows.append([Q, H, e, 1000 * G * Q * H / e / 1000, 1025 * G * Q * H / e / 1000])
write("st_pump_power.csv", ["Q_m3_s", "H_m", "eta", "P_kW_fresh_1000", "P_kW_sea_1025"], rows, "P = rho g Q H / eta")
