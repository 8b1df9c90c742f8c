//! The literature, once. Seen by rustdoc only: docstrings link to the items, and an entry says where it was not checked against the printed work ("from memory").

/// J. P. Lewis, "Fast template matching", *Vision Interface* 1995, pp. 120–123. From memory.
#[derive(Debug)]
pub struct Lewis95;
/// D. Robinson, P. Milanfar, "Fundamental performance limits in image registration", *IEEE Trans. Image Process.* **13**(9), 1185–1199 (2004), doi:10.1109/TIP.2004.832923.
#[derive(Debug)]
pub struct RobinsonMilanfar04;
/// K. Levenberg, *Quart. Appl. Math.* **2**, 164–168 (1944); D. W. Marquardt, *J. SIAM* **11**(2), 431–441 (1963); J. J. Moré, "The Levenberg–Marquardt algorithm: implementation and theory", *Lect. Notes Math.* **630**, 105–116 (1978). From memory.
#[derive(Debug)]
pub struct LevenbergMarquardt;
/// G. H. Golub, V. Pereyra, "The differentiation of pseudo-inverses and nonlinear least squares problems whose variables separate", *SIAM J. Numer. Anal.* **10**(2), 413–432 (1973), doi:10.1137/0710036.
#[derive(Debug)]
pub struct GolubPereyra73;
/// W. K. Newey, K. D. West, "A simple, positive semi-definite, heteroskedasticity and autocorrelation consistent covariance matrix", *Econometrica* **55**(3), 703–708 (1987), doi:10.2307/1913610.
#[derive(Debug)]
pub struct NeweyWest87;
/// D. J. Venzon, S. H. Moolgavkar, "A method for computing profile-likelihood-based confidence intervals", *Appl. Stat.* **37**(1), 87–94 (1988), doi:10.2307/2347496.
#[derive(Debug)]
pub struct VenzonMoolgavkar88;
/// Y.-X. Yao, S. M. Pandit, "Cramér–Rao lower bounds for a damped sinusoidal process", *IEEE Trans. Signal Process.* **43**(4), 878–885 (1995), doi:10.1109/78.376840. Volume and pages from memory.
#[derive(Debug)]
pub struct YaoPandit95;
/// JCGM 100:2008, *Guide to the expression of uncertainty in measurement* (GUM). Clauses from memory.
#[derive(Debug)]
pub struct Gum;
/// ISO 2041, *Mechanical vibration, shock and condition monitoring: Vocabulary*. From memory.
#[derive(Debug)]
pub struct Iso2041;
/// ISO/IEC 14496-12, *ISO base media file format*. From memory.
#[derive(Debug)]
pub struct Iso14496_12;
/// ITU-R BT.709 and BT.601, luma and its limited range. From memory.
#[derive(Debug)]
pub struct ItuRBt709;
/// NIST Statistical Reference Datasets, nonlinear regression (National Institute of Standards and Technology).
#[derive(Debug)]
pub struct NistStrd;
/// A. Wald, J. Wolfowitz, "On a test whether two samples are from the same population", *Ann. Math. Stat.* **11**, 147–162 (1940): the runs test. From memory.
#[derive(Debug)]
pub struct WaldWolfowitz40;
/// H. Akaike, *IEEE Trans. Autom. Control* **19**, 716–723 (1974); C. M. Hurvich, C.-L. Tsai, *Biometrika* **76**, 297–307 (1989): AIC and its small-sample form AICc. From memory.
#[derive(Debug)]
pub struct HurvichTsai89;
/// J. W. Tukey's biweight and the median absolute deviation, as in P. J. Huber, *Robust Statistics* (Wiley 1981). From memory.
#[derive(Debug)]
pub struct Huber81;
/// D. M. Bates, D. G. Watts, "A relative offset orthogonality convergence criterion for nonlinear least squares", *Technometrics* **23**(2), 179–183 (1981). From memory.
#[derive(Debug)]
pub struct BatesWatts81;
/// S. Baker, I. Matthews, "Lucas–Kanade 20 years on: a unifying framework", *Int. J. Comput. Vis.* **56**(3), 221–255 (2004), doi:10.1023/B:VISI.0000011205.11775.fd.
#[derive(Debug)]
pub struct BakerMatthews04;
/// B. Pan, K. Li, W. Tong, "Fast, robust and accurate digital image correlation calculation without redundant computations", *Exp. Mech.* **53**, 1277–1289 (2013), doi:10.1007/s11340-013-9717-6.
#[derive(Debug)]
pub struct Pan13;
/// R. G. Keys, "Cubic convolution interpolation for digital image processing", *IEEE Trans. Acoust. Speech Signal Process.* **29**(6), 1153–1160 (1981). From memory.
#[derive(Debug)]
pub struct Keys81;
