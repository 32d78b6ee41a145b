"""Names of the model parameters that ngspice takes for BSIM3v3, versions 3.0 to 3.3, in the order of its own list."""

from __future__ import annotations

from tauledger.devices.family import names

MODEL_PARAMETERS = names(
    """
    capmod mobmod noimod nqsmod acnqsmod acm calcacm paramchk binunit version tox toxm cdsc cdscb cdscd cit nfactor
    xj vsat at a0 ags a1 a2 keta nsub nch ngate gamma1 gamma2 vbx vbm xt k1 kt1 kt1l kt2 k2 k3 k3b w0 nlx dvt0 dvt1
    dvt2 dvt0w dvt1w dvt2w drout dsub vth0 vtho ua ua1 ub ub1 uc uc1 u0 ute voff tnom cgso cgdo cgbo xpart elm delta
    rsh rdsw prwg prwb prt eta0 etab pclm pdiblc1 pdiblc2 pdiblcb pscbe1 pscbe2 pvag js jsw pb nj xti mj pbsw mjsw
    pbswg mjswg cj vfbcv vfb cjsw cjswg tpb tcj tpbsw tcjsw tpbswg tcjswg acde moin noff voffcv lintnoi lint ll llc
    lln lw lwc lwn lwl lwlc lmin lmax xl xw wr wint dwg dwb wl wlc wln ww wwc wwn wwl wwlc wmin wmax b0 b1 cgsl cgdl
    ckappa cf clc cle dwc dlc hdif ldif ld rd rs rdc rsc wmlt alpha0 alpha1 beta0 ijth lcdsc lcdscb lcdscd lcit
    lnfactor lxj lvsat lat la0 lags la1 la2 lketa lnsub lnch lngate lgamma1 lgamma2 lvbx lvbm lxt lk1 lkt1 lkt1l
    lkt2 lk2 lk3 lk3b lw0 lnlx ldvt0 ldvt1 ldvt2 ldvt0w ldvt1w ldvt2w ldrout ldsub lvth0 lvtho lua lua1 lub lub1 luc
    luc1 lu0 lute lvoff lelm ldelta lrdsw lprwg lprwb lprt leta0 letab lpclm lpdiblc1 lpdiblc2 lpdiblcb lpscbe1
    lpscbe2 lpvag lwr ldwg ldwb lb0 lb1 lcgsl lcgdl lckappa lcf lclc lcle lalpha0 lalpha1 lbeta0 lvfbcv lvfb lacde
    lmoin lnoff lvoffcv wcdsc wcdscb wcdscd wcit wnfactor wxj wvsat wat wa0 wags wa1 wa2 wketa wnsub wnch wngate
    wgamma1 wgamma2 wvbx wvbm wxt wk1 wkt1 wkt1l wkt2 wk2 wk3 wk3b ww0 wnlx wdvt0 wdvt1 wdvt2 wdvt0w wdvt1w wdvt2w
    wdrout wdsub wvth0 wvtho wua wua1 wub wub1 wuc wuc1 wu0 wute wvoff welm wdelta wrdsw wprwg wprwb wprt weta0
    wetab wpclm wpdiblc1 wpdiblc2 wpdiblcb wpscbe1 wpscbe2 wpvag wwr wdwg wdwb wb0 wb1 wcgsl wcgdl wckappa wcf wclc
    wcle walpha0 walpha1 wbeta0 wvfbcv wvfb wacde wmoin wnoff wvoffcv pcdsc pcdscb pcdscd pcit pnfactor pxj pvsat
    pat pa0 pags pa1 pa2 pketa pnsub pnch pngate pgamma1 pgamma2 pvbx pvbm pxt pk1 pkt1 pkt1l pkt2 pk2 pk3 pk3b pw0
    pnlx pdvt0 pdvt1 pdvt2 pdvt0w pdvt1w pdvt2w pdrout pdsub pvth0 pvtho pua pua1 pub pub1 puc puc1 pu0 pute pvoff
    pelm pdelta prdsw pprwg pprwb pprt peta0 petab ppclm ppdiblc1 ppdiblc2 ppdiblcb ppscbe1 ppscbe2 ppvag pwr pdwg
    pdwb pb0 pb1 pcgsl pcgdl pckappa pcf pclc pcle palpha0 palpha1 pbeta0 pvfbcv pvfb pacde pmoin pnoff pvoffcv noia
    noib noic em ef af kf vgs_max vgd_max vgb_max vds_max vbs_max vbd_max vgsr_max vgdr_max vgbr_max vbsr_max
    vbdr_max
    """
)
