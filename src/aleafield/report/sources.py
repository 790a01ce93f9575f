"""Published sources of the methods, and the numbers under which a text cites them."""

from __future__ import annotations

SOURCES: dict[str, str] = {
    "field": "Amari, S. (1977). Dynamics of pattern formation in lateral-inhibition type neural fields. "
    "Biological Cybernetics 27, 77-87.",
    "projection": "Atkinson, K. E. (1997). The Numerical Solution of Integral Equations of the Second Kind. "
    "Cambridge University Press.",
    "runge kutta": "Hairer, E., Norsett, S. P. and Wanner, G. (1993). Solving Ordinary Differential "
    "Equations I. Springer.",
    "sobol": "Sobol', I. M. (1967). On the distribution of points in a cube and the approximate evaluation "
    "of integrals. USSR Computational Mathematics and Mathematical Physics 7, 86-112.",
    "scrambling": "Matousek, J. (1998). On the L2-discrepancy for anchored boxes. Journal of Complexity 14, "
    "527-556.",
    "philox": "Salmon, J. K., Moraes, M. A., Dror, R. O. and Shaw, D. E. (2011). Parallel random numbers: "
    "as easy as 1, 2, 3. Proceedings of SC11.",
    "wilson": "Wilson, E. B. (1927). Probable inference, the law of succession, and statistical inference. "
    "Journal of the American Statistical Association 22, 209-212.",
    "woodruff": "Woodruff, R. S. (1952). Confidence intervals for medians and other position measures. "
    "Journal of the American Statistical Association 47, 635-646.",
    "equations": "Da Prato, G. and Zabczyk, J. (1992). Stochastic Equations in Infinite Dimensions. Cambridge "
    "University Press.",
    "euler maruyama": "Kloeden, P. E. and Platen, E. (1992). Numerical Solution of Stochastic Differential "
    "Equations. Springer.",
    "passage": "Gobet, E. (2000). Weak approximation of killed diffusion using Euler schemes. Stochastic "
    "Processes and their Applications 87, 167-197.",
    "components": "Williams, J. S. (1962). A confidence interval for variance components. Biometrika 49, "
    "278-281.",
    "homogeneous chaos": "Wiener, N. (1938). The homogeneous chaos. American Journal of Mathematics 60, 897-936.",
    "chaos": "Xiu, D. and Karniadakis, G. E. (2002). The Wiener-Askey polynomial chaos for stochastic differential "
    "equations. SIAM Journal on Scientific Computing 24, 619-644.",
    "chaos indices": "Sudret, B. (2008). Global sensitivity analysis using polynomial chaos expansions. Reliability "
    "Engineering and System Safety 93, 964-979.",
    "rosenblatt": "Rosenblatt, M. (1952). Remarks on a multivariate transformation. Annals of Mathematical "
    "Statistics 23, 470-472.",
    "sobol indices": "Sobol', I. M. (1993). Sensitivity estimates for nonlinear mathematical models. Mathematical "
    "Modelling and Computational Experiments 1, 407-414.",
    "total index": "Homma, T. and Saltelli, A. (1996). Importance measures in global sensitivity analysis of "
    "nonlinear models. Reliability Engineering and System Safety 52, 1-17.",
    "saltelli": "Saltelli, A., Annoni, P., Azzini, I., Campolongo, F., Ratto, M. and Tarantola, S. (2010). Variance "
    "based sensitivity analysis of model output. Computer Physics Communications 181, 259-270.",
    "exchange": "Azzini, I., Mara, T. A. and Rosati, R. (2021). Comparison of two sets of Monte Carlo estimators of "
    "Sobol' indices. Environmental Modelling and Software 144, 105167.",
    "shapley": "Owen, A. B. (2014). Sobol' indices and Shapley value. SIAM/ASA Journal on Uncertainty Quantification "
    "2, 245-251.",
    "shapley algorithm": "Song, E., Nelson, B. L. and Staum, J. (2016). Shapley effects for global sensitivity "
    "analysis: theory and computation. SIAM/ASA Journal on Uncertainty Quantification 4, 1060-1083.",
    "primer": "Saltelli, A., Ratto, M., Andres, T., Campolongo, F., Cariboni, J., Gatelli, D., Saisana, M. and "
    "Tarantola, S. (2008). Global Sensitivity Analysis: The Primer. Wiley.",
    "convergence": "Roache, P. J. (1994). Perspective: a method for uniform reporting of grid refinement "
    "studies. Journal of Fluids Engineering 116, 405-413.",
}
"""Published sources of the methods, from memory."""


class Citations:
    """Numbers the sources in the order in which they are cited."""

    def __init__(self) -> None:
        self.keys: list[str] = []

    def __call__(self, *keys: str) -> str:
        """The numbers of sources in brackets, as in "[3, 1]"."""
        for key in keys:
            if key not in self.keys:
                self.keys.append(key)
        return "[" + ", ".join(str(self.keys.index(key) + 1) for key in keys) + "]"

    def sources(self) -> tuple[str, ...]:
        """What was cited, in the order of the numbers."""
        return tuple(SOURCES[key] for key in self.keys)
