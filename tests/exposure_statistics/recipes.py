"""How each row of the exposure check table is worked out with the library, by its quantity."""

import math

import numpy as np
from scipy.special import nctdtr

from exposure.statistics import compliance, goodness, limits, positions, sampling, series, units
from exposure.statistics import variance as var
from exposure.statistics.bayes import GSD_RANGE, PRIORS, Prior, posterior
from exposure.statistics.censored import mean_limit, quantile_limit, tobit, x95_limit
from exposure.statistics.decisions import all_below_bound, describe, share_above_lod
from exposure.statistics.lognormal import (
    exceedance,
    gm_limit,
    k_factor,
    land,
    moments,
    summary,
    utl,
)
from exposure.statistics.pack import pack
from tests.published.check_rows import read_commented

PRIOR_OF_WORDS = {
    "flat mu, 1/sigma unbounded": "ref",
    "flat mu, flat sigma unbounded": "flat",
    "flat mu, flat sigma on": Prior("uniform", gsd=GSD_RANGE),
    "flat mu, ln sigma": Prior("lognormal", gsd=GSD_RANGE),
    "ln GM uniform": "weak",
}
LABELS = {
    "pass": compliance.COMPLIANT,
    "undecided": compliance.UNDECIDED,
    "fail": compliance.NOT_COMPLIANT,
    "pass_if_boundary_allowed": compliance.COMPLIANT,
}


class Given:
    """Inputs of a row: words, numbers, lists, and its data set as a batch of one group."""

    def __init__(self, row):
        pairs = (part.split("=", 1) for part in row.inputs.split("; ") if "=" in part)
        self.words = {key.strip(): text.strip() for key, text in pairs}

    def __getitem__(self, key):
        return float(self.words[key].split()[0])

    def listed(self, key):
        return np.array([float(text.split()[0]) for text in self.words[key].split(",")])

    def lines(self):
        lines = read_commented(f"datasets/{self.words['dataset']}.csv")
        for key in ("role", "group", "case"):
            if key in self.words:
                lines = [line for line in lines if line[key] == self.words[key]]
        return lines

    def column(self, name="value"):
        return np.array([float(line[name]) for line in self.lines()])

    @property
    def censored(self):
        return np.array([line.get("censored", "0") == "1" for line in self.lines()])

    @property
    def batch(self):
        values, below = self.column(), self.censored
        if "recensor_at" in self.words:
            below = below | (values < self["recensor_at"])
            values = np.maximum(values, np.where(below, self["recensor_at"], 0.0))
        if self.words.get("nondetect") == "half":
            values, below = np.where(below, 0.5 * values, values), np.zeros_like(below)
        return one_group(values, below)

    @property
    def logs(self):
        return np.log(self.column())

    @property
    def prior(self):
        words = self.words["prior"]
        return next(prior for start, prior in PRIOR_OF_WORDS.items() if words.startswith(start))


def one_group(values, censored=None):
    flags = np.zeros(len(values), bool) if censored is None else censored
    return pack(values, flags, np.zeros(len(values), int), n_groups=1)


def _posterior(given, **more):
    limit = given["limit"] if "limit" in given.words else 1.0
    return posterior(given.batch, limit, prior=given.prior, **more)


def _x95_quantile(given):
    found = _posterior(given)
    return {0.70: found.q70, 0.95: found.q95}[given["q"]]


def _normal_limit(given, conf):
    x = given.column()
    return x.mean() + k_factor(x.size, p=0.95, conf=conf) * x.std(ddof=1)


def _sae(given):
    return limits.sae_limits(
        given.listed("C"), given.listed("T"), sae=given["sae"], limit=given["limit"]
    )


def _twa_8h(given):
    return sampling.twa(given.listed("C"), 60.0 * given.listed("T"), gap_rule="zero").value


def _ros(given):
    below, values = given.batch.censored[0], given.batch.values[0]
    if "positions" in given.words:
        return positions.ros(values, below, a=0.375, positions="ranks")
    return positions.ros(values, below, a=given["a"])


def _kaplan_meier(given):
    logs = given.words.get("scale") == "ln"
    leftover = given.words["remaining_mass"].replace("lod", "limit").replace("_", " ")
    values = given.logs if logs else given.column()
    return positions.kaplan_meier(values, given.censored, leftover=leftover)


def _fit(given):
    return goodness.goodness_of_fit(given.batch, scale=given.words["scale"])


def _components(given):
    return var.components(*_logs_and_labels(given))


def _logs_and_labels(given):
    lines = given.lines()
    if "ln_value" in lines[0]:
        # The published analysis takes the two background wells as one group.
        labels = [line["role"] if line["role"] == "background" else line["group"] for line in lines]
        return given.column("ln_value"), labels
    name = "worker" if "worker" in lines[0] else "group"
    y = given.logs if given.words.get("scale") == "ln" else given.column()
    return y, [line[name] for line in lines]


def _panel(given, **more):
    return var.likelihood_components(*_logs_and_labels(given), **more)


def _position(given):
    found, below = _ros(given), given.censored
    return np.sort(found.position[~below])[int(given["detect_rank"]) - 1]


def _exceedance_at_limit(given):
    _, share = positions.exceedance_at_limits(given.column(), given.censored)
    return share[0]


def _right_censored(given):
    below = np.array([line["right_censored"] == "1" for line in given.lines()])
    return -tobit(one_group(1.0 / given.column(), below)).mu


def _substituted(given):
    factor = {"half": 0.5, "root2": math.sqrt(0.5)}[given.words["factor"]]
    return summary(positions.substituted(given.batch, factor=factor))


def _prior_quantile(given):
    low, high = np.log(np.log(GSD_RANGE))
    log_sigma = np.linspace(low, high, 20001)
    mass = np.cumsum(np.exp(PRIORS["weak"].log_density(log_sigma)))
    return math.exp(math.exp(np.interp(given["quantile"], mass / mass[-1], log_sigma)))


def _shift(given):
    return series.shift_summary(given.column("minute"), given.column())


def _tobit_mean(fit):
    return np.exp(fit.mu + 0.5 * fit.sigma**2)


def _workers(given):
    size = None if given.words["N"] == "infinite" else int(given["N"])
    return limits.workers_to_sample(size, top_share=given["top"], conf=given["conf"])


def _moment_limit(given):
    k = k_factor(given["n"], p=given["p"], conf=given["conf"])
    return np.exp(given["mean_ln"] + k * given["sd_ln"])


def _ml_with_complete_k(given):
    fit, n = tobit(given.batch), given.column().size
    return np.exp(fit.mu + k_factor(n, p=given["p"], conf=given["conf"]) * fit.sigma)


RECIPES = {
    "twa_8h": _twa_8h,
    "twa": lambda g: sampling.twa(g.listed("C"), g.listed("T"), reference_minutes=None).value,
    "twa_8h_unsampled_same": lambda g: (
        sampling.twa(
            g.listed("C"), g.listed("T"), gap_minutes=g["unsampled"], gap_rule="same"
        ).value
    ),
    "mixture_index": lambda g: limits.mixture_index(g.listed("C"), g.listed("L")).index,
    "sae_mixture_control_limit": lambda g: (
        limits.mixture_index(g.listed("ratios"), np.ones(2), sae=g.listed("sae")).control
    ),
    "concentration": lambda g: (
        sampling.concentration(g["mass_mg"], [], litres=g["litres"], lod_mass_mg=np.nan).value_mg_m3
    ),
    "concentration_pooled": lambda g: sampling.pooled_concentration(
        g.listed("mass_mg"), g.listed("litres")
    ),
    "mass_weighted_percent": lambda g: sampling.mass_weighted_percent(
        g.listed("pct"), g.listed("mass_mg")
    ),
    "silica_mixture_limit": lambda g: limits.silica_limit_mg_m3(
        g["quartz"], cristobalite_percent=g["cristobalite"], tridymite_percent=g["tridymite"]
    ),
    "silica_quartz_limit": lambda g: limits.silica_limit_mg_m3(g["quartz"]),
    "silica_cristobalite_limit": lambda g: limits.silica_limit_mg_m3(
        0.0, cristobalite_percent=g["cristobalite"]
    ),
    "severity": lambda g: limits.mixture_index([g["conc"]], [g["limit"]]).index,
    "molar_volume": lambda g: units.molar_volume_l(g["t_c"], g["p_mmhg"]),
    "ppm_to_mgm3": lambda g: units.ppm_to_mg_m3(g["ppm"], g["mw"], molar_volume_l=g["vm"]),
    "mgm3_to_ppm_tp": lambda g: units.ppm_at_conditions(
        g["mgm3"], g["mw"], t_c=g["t_c"], p_mmhg=g["p_mmhg"]
    ),
    "flow_change_fraction": lambda g: (
        sampling.air_volume(g["flow_pre"], g["flow_post"], minutes=480.0).drift
    ),
    "respirable_fraction": lambda g: sampling.size_fraction(g["d_um"], "respirable"),
    "thoracic_fraction": lambda g: sampling.size_fraction(g["d_um"], "thoracic"),
    "inhalable_fraction": lambda g: sampling.size_fraction(g["d_um"], "inhalable"),
    "sae_lcl": lambda g: limits.sae_limits([g["y"]], [480.0], sae=g["sae"], limit=1.0).lower,
    "standardised_conc": lambda g: (
        limits.sae_limits([g["x"]], [450.0], sae=0.0, limit=g["limit"]).ratio
    ),
    "sae_lcl_consecutive": lambda g: _sae(g).lower,
    "sae_ucl_consecutive": lambda g: _sae(g).upper,
    "lead_adjusted_limit": lambda g: limits.adjust(
        50.0, "lead", hours_day=g["hours"], hours_week=40.0
    ),
    "brief_scala_daily": lambda g: limits.adjust(
        1.0, "brief_scala_daily", hours_day=g["hours"], hours_week=40.0
    ),
    "brief_scala_weekly": lambda g: limits.adjust(
        1.0, "brief_scala_weekly", hours_day=8.0, hours_week=g["hours"]
    ),
    "gm": lambda g: summary(g.batch).gm,
    "gsd": lambda g: summary(g.batch).gsd,
    "x95": lambda g: summary(g.batch).x95,
    "am_mvue": lambda g: summary(g.batch).am_mvue,
    "mean_ln": lambda g: moments(g.batch).ybar,
    "sd_ln": lambda g: moments(g.batch).s,
    "am_qmle": lambda g: np.exp(moments(g.batch).ybar + 0.5 * moments(g.batch).s ** 2),
    "am_mle": lambda g: _tobit_mean(tobit(g.batch)),
    "exceedance_point": lambda g: exceedance(g.batch, g["limit"]).point,
    "exceedance_ucl95": lambda g: exceedance(g.batch, g["limit"]).upper,
    "exceedance_lcl95": lambda g: exceedance(g.batch, g["limit"]).lower,
    "utl": lambda g: utl(g.batch, p=g["p"], conf=g["conf"]),
    "land_ucl": lambda g: land(g.batch, conf=g["conf"]),
    "land_lcl": lambda g: land(g.batch, conf=1.0 - g["conf"]),
    "gm_ucl": lambda g: gm_limit(g.batch, conf=g["conf"]),
    "shapiro_w": lambda g: _fit(g).w,
    "shapiro_p": lambda g: _fit(g).p,
    "ppcc_blom": lambda g: _fit(g).ppcc,
    "normal_x95_ucl": lambda g: _normal_limit(g, g["conf"]),
    "normal_x95_lcl": lambda g: _normal_limit(g, 1.0 - g["conf"]),
    "utl_from_moments": _moment_limit,
    "k_one_sided": lambda g: k_factor(g["n"], p=g["p"], conf=g["conf"]),
    "nct_ppf": lambda g: k_factor(6, p=0.95, conf=g["q"]) * math.sqrt(6.0),
    "nct_cdf": lambda g: nctdtr(g["df"], g["nc"], g["x"]),
    "en689_ut": lambda g: k_factor(g["n"], p=0.95, conf=compliance.GROUP_CONF),
    "en689_ur": lambda g: compliance.en689_group(g.batch, g["limit"]).distance,
    "ms_within": lambda g: _components(g).ms_within,
    "ms_between": lambda g: _components(g).ms_between,
    "var_between": lambda g: _components(g).var_between,
    "var_between_truncated": lambda g: _components(g).var_between,
    "var_between_raw": lambda g: _components(g).var_between_raw,
    "mean_square_residual_population": lambda g: _components(g).ms_within * 24.0 / 30.0,
    "mean_square_total_population": lambda g: (
        (_components(g).ms_within * 24.0 + _components(g).ms_between * 5.0) / 30.0
    ),
    "ml_minus_two_loglik": lambda g: _panel(g, is_restricted=False).minus_two_log_likelihood,
    "reml_var_within": lambda g: _panel(g).var_within,
    "r095_between": lambda g: var.worker_range(g["var_between"]),
    "uniform_group_var_between_max": lambda g: var.var_between_of_range(g["r095"]),
    "prob_worker_mean_over_limit": lambda g: var.worker_mean_over_limit(
        math.log(0.12), g["var_b"], var_within=g["var_w"], limit=g["limit"]
    ),
    "mle_mean_ln": lambda g: tobit(g.batch).mu,
    "mle_sd_ln": lambda g: tobit(g.batch).sigma,
    "scipy_lognorm_fit_sigma": lambda g: tobit(g.batch).sigma,
    "mle_am": lambda g: _tobit_mean(tobit(g.batch)),
    "mle_sd": lambda g: _tobit_mean(tobit(g.batch)) * np.sqrt(np.expm1(tobit(g.batch).sigma ** 2)),
    "mle_p90": lambda g: np.exp(tobit(g.batch).mu + 1.2815515655446 * tobit(g.batch).sigma),
    "mle_x95": lambda g: describe(g.batch, 200.0).x95,
    "profile_am_lcl": lambda g: mean_limit(g.batch, conf=g["conf"], side="lower"),
    "profile_am_ucl": lambda g: mean_limit(g.batch, conf=g["conf"]),
    "profile_meanln_ucl": lambda g: np.log(quantile_limit(g.batch, p=0.5, conf=g["conf"])),
    "profile_x95_ucl": lambda g: x95_limit(g.batch, conf=g["conf"]),
    "utl_mle_k_approx": _ml_with_complete_k,
    "right_censored_mle_mean_ln": _right_censored,
    "rros_cv": lambda g: _ros(g).completed.std(ddof=1) / _ros(g).completed.mean(),
    "rros_mean": lambda g: _ros(g).completed.mean(),
    "rros_sd": lambda g: _ros(g).completed.std(ddof=1),
    "rros_median": lambda g: np.median(_ros(g).completed),
    "rros_mean_ln": lambda g: np.log(_ros(g).completed).mean(),
    "rros_imputed_sorted": lambda g: np.sort(_ros(g).completed)[int(g["order"]) - 1],
    "ros_parametric_mean_ln": lambda g: _ros(g).mean_ln,
    "ros_parametric_sd_ln": lambda g: _ros(g).sd_ln,
    "hirsch_stedinger_position": _position,
    "exceedance_prob_at_lod": _exceedance_at_limit,
    "km_mean": lambda g: _kaplan_meier(g).mean,
    "km_mean_ln": lambda g: _kaplan_meier(g).mean,
    "km_sd": lambda g: _kaplan_meier(g).sd,
    "beta_sub_bm": lambda g: positions.beta_substitution(g.batch).beta_mean,
    "beta_sub_am": lambda g: positions.beta_substitution(g.batch).am,
    "beta_sub_gm": lambda g: positions.beta_substitution(g.batch).gm,
    "beta_sub_gsd": lambda g: positions.beta_substitution(g.batch).gsd,
    "beta_sub_x95": lambda g: positions.beta_substitution(g.batch).x95,
    "substitution_x95": lambda g: _substituted(g).x95,
    "substitution_gsd": lambda g: _substituted(g).gsd,
    "mean_below_lod_over_lod": lambda g: positions.mean_below_limit(
        g["gsd"], g["fraction_censored"]
    ),
    "posterior_x95_quantile": _x95_quantile,
    "prob_x95_over": lambda g: _posterior(g, multiples=(g["multiple"],)).p_over[:, 0],
    "prior_gsd_median": lambda _: math.exp(PRIORS["weak"].median_sigma),
    "prior_gsd_quantile": _prior_quantile,
    "hazard_ratio_default": lambda g: describe(g.batch, g["limit"]).ratio,
    "hazard_ratio_conservative": lambda g: describe(g.batch, g["limit"]).ratio95,
    "autocorr_lag1": lambda g: series.lag1_correlation(g.logs),
    "equivalent_n_ar1": lambda g: series.equivalent_readings(g["n"], g["rho"]),
    "shift_twa": lambda g: _shift(g).twa,
    "max_15min_twa": lambda g: _shift(g).highest_15_min,
    "prob_declare_compliant": lambda g: compliance.compliance_chance(
        g["n"], g["gsd"], g["true_x95_over_limit"], conf=g["conf"]
    ),
    "prelim_pass_prob_at_5pct_exceedance": lambda g: compliance.preliminary_pass_chance(
        g["gsd"], int(g["n"])
    ),
    "workers_to_sample": _workers,
    "all_censored_x95_bound_over_lod": lambda g: all_below_bound(
        1.0, g["n"], conf=g["conf"], sigma=g["sigma"]
    ),
    "all_censored_exceedance_ucl": lambda g: share_above_lod(g["n"], conf=g["conf"]),
}
