"""Sources cited in the code: key -> citation. Docstrings cite the keys in square brackets."""

from __future__ import annotations

REFERENCES: dict[str, str] = {
    "aki1980": "Aki, K. and Richards, P. G. (1980). Quantitative Seismology. W. H. Freeman.",
    "alexa2022": "Alexa, M. (2022). Super-Fibonacci spirals: fast, low-discrepancy sampling of SO(3). CVPR 2022, 8291-8300. "
    "doi:10.1109/CVPR52688.2022.00811",
    "anderson1951": "Anderson, E. M. (1951). The Dynamics of Faulting and Dyke Formation. Oliver and Boyd.",
    "bott1959": "Bott, M. H. P. (1959). The mechanics of oblique slip faulting. Geol. Mag. 96, 109-117. doi:10.1017/S0016756800059987",
    "efron1992": "Efron, B. (1992). Jackknife-after-bootstrap standard errors and influence functions. J. R. Statist. Soc. B 54, 83-127. "
    "doi:10.1111/j.2517-6161.1992.tb01866.x",
    "fisher1953": "Fisher, R. A. (1953). Dispersion on a sphere. Proc. R. Soc. A 217, 295-305. doi:10.1098/rspa.1953.0064",
    "kamb1959": "Kamb, W. B. (1959). Ice petrofabric observations from Blue Glacier, Washington, in relation to theory and experiment. "
    "J. Geophys. Res. 64, 1891-1909. doi:10.1029/JZ064i011p01891",
    "lund2007": "Lund, B. and Townend, J. (2007). Calculating horizontal stress orientations with full or partial knowledge of the "
    "tectonic stress tensor. Geophys. J. Int. 170, 1328-1335. doi:10.1111/j.1365-246X.2007.03468.x",
    "michael1984": "Michael, A. J. (1984). Determination of stress from slip data: faults and folds. J. Geophys. Res. 89, 11517-11526. "
    "doi:10.1029/JB089iB13p11517",
    "morris1996": "Morris, A., Ferrill, D. A. and Henderson, D. B. (1996). Slip-tendency analysis and fault reactivation. Geology 24, "
    "275-278. doi:10.1130/0091-7613(1996)024<0275:STAAFR>2.3.CO;2",
    "robin1986": "Robin, P.-Y. F. and Jowett, E. C. (1986). Computerized density contouring and statistical evaluation of orientation "
    "data using counting circles and continuous weighting functions. Tectonophysics 121, 207-223. doi:10.1016/0040-1951(86)90044-2",
    "tukey1977": "Tukey, J. W. (1977). Exploratory Data Analysis. Addison-Wesley, section 16E (twicing). (Cited from memory.)",
    "platt1999": "Platt, J. (1999). Probabilistic outputs for support vector machines and comparisons to regularized likelihood methods. "
    "In: Advances in Large Margin Classifiers, MIT Press, 61-74. (Cited from memory.)",
    "simpson1997": "Simpson, R. W. (1997). Quantifying Anderson's fault types. J. Geophys. Res. 102, 17909-17919. doi:10.1029/97JB01274",
    "wallace1951": "Wallace, R. E. (1951). Geometry of shearing stress and relation to faulting. J. Geol. 59, 118-130. doi:10.1086/625831",
    "wilson1927": "Wilson, E. B. (1927). Probable inference, the law of succession, and statistical inference. J. Am. Stat. Assoc. 22, "
    "209-212. doi:10.1080/01621459.1927.10502953",
    "woodcock1977": "Woodcock, N. H. (1977). Specification of fabric shapes using an eigenvalue method. Geol. Soc. Am. Bull. 88, "
    "1231-1236. doi:10.1130/0016-7606(1977)88<1231:SOFSUA>2.0.CO;2",
    "zoback1992": "Zoback, M. L. (1992). First- and second-order patterns of stress in the lithosphere: the World Stress Map project. "
    "J. Geophys. Res. 97, 11703-11728. doi:10.1029/92JB00132",
    "byerlee1978": "Byerlee, J. (1978). Friction of rocks. Pure Appl. Geophys. 116, 615-626. doi:10.1007/BF00876528",
    "ferrill1999": "Ferrill, D. A. et al. (1999). Stressed rock strains groundwater at Yucca Mountain, Nevada. GSA Today 9(5), 1-8.",
    "kagan1991": "Kagan, Y. Y. (1991). 3-D rotation of double-couple earthquake sources. Geophys. J. Int. 106, 709-716. "
    "doi:10.1111/j.1365-246X.1991.tb06343.x",
    "vavrycuk2014": "Vavrycuk, V. (2014). Iterative joint inversion for stress and fault orientations from focal mechanisms. "
    "Geophys. J. Int. 199, 69-77. doi:10.1093/gji/ggu224",
    "snyder1987": "Snyder, J. P. (1987). Map Projections: A Working Manual. USGS Professional Paper 1395. doi:10.3133/pp1395",
    "mardia2000": "Mardia, K. V. and Jupp, P. E. (2000). Directional Statistics. Wiley. doi:10.1002/9780470316979",
    "fisher1987": "Fisher, N. I., Lewis, T. and Embleton, B. J. J. (1987). Statistical Analysis of Spherical Data. Cambridge. "
    "doi:10.1017/CBO9780511623059",
    "dempster1977": "Dempster, A. P., Laird, N. M. and Rubin, D. B. (1977). Maximum likelihood from incomplete data via the EM algorithm. "
    "J. R. Stat. Soc. B 39, 1-38. doi:10.1111/j.2517-6161.1977.tb01600.x",
    "schwarz1978": "Schwarz, G. (1978). Estimating the dimension of a model. Ann. Stat. 6, 461-464. doi:10.1214/aos/1176344136",
}
