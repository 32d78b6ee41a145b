"""Names of the model parameters that ngspice takes for BSIM4, versions 4.5 to 4.8, in the order of its own list."""

from __future__ import annotations

from tauledger.devices.family import names

MODEL_PARAMETERS = names(
    """
    cvchargemod capmod diomod rdsmod trnqsmod acnqsmod mobmod rbodymod rgatemod permod geomod rgeomod fnoimod
    tnoimod mtrlmod mtrlcompatmod igcmod igbmod tempmod gidlmod paramchk binunit version eot vddeot tempeot leffeot
    weffeot ados bdos toxe toxp toxm toxref dtox epsrox cdsc cdscb cdscd cit nfactor xj vsat at a0 ags a1 a2 keta
    phig epsrgate easub epsrsub ni0sub bg0sub tbgasub tbgbsub nsub ndep nsd phin ngate gamma1 gamma2 vbx vbm xt k1
    kt1 kt1l kt2 k2 k3 k3b w0 dvtp0 dvtp1 dvtp2 dvtp3 dvtp4 dvtp5 lpe0 lpeb dvt0 dvt1 dvt2 dvt0w dvt1w dvt2w drout
    dsub vth0 vtho ua ua1 ub ub1 uc uc1 ud ud1 up lp u0 eu ucs ute ucste voff minv minvcv voffl voffcvl tnom cgso
    cgdo cgbo xpart delta rsh rdsw rdswmin rsw rdw rdwmin rswmin prwg prwb prt eta0 etab pclm pdiblc1 pdiblc2
    pdiblcb fprout pdits pditsl pditsd pscbe1 pscbe2 pvag jss jsws jswgs pbs njs xtis mjs pbsws mjsws pbswgs mjswgs
    cjs cjsws cjswgs jsd jswd jswgd pbd njd xtid mjd pbswd mjswd pbswgd mjswgd cjd cjswd cjswgd vfbcv vfb tpb tcj
    tpbsw tcjsw tpbswg tcjswg acde moin noff voffcv dmcg dmci dmdg dmcgt xgw xgl rshg ngcon xrcrg1 xrcrg2 lambda vtl
    lc xn vfbsdoff tvfbsdoff tvoff tnfactor teta0 tvoffcv lintnoi lint ll llc lln lw lwc lwn lwl lwlc lmin lmax wr
    wint dwg dwb wl wlc wln ww wwc wwn wwl wwlc wmin wmax b0 b1 cgsl cgdl ckappas ckappad cf clc cle dwc dlc xw xl
    dlcig dlcigd dwj alpha0 alpha1 beta0 agidl bgidl cgidl rgidl kgidl fgidl egidl agisl bgisl cgisl rgisl kgisl
    fgisl egisl aigc bigc cigc aigsd bigsd cigsd aigs bigs cigs aigd bigd cigd aigbacc bigbacc cigbacc aigbinv
    bigbinv cigbinv nigc nigbinv nigbacc ntox eigbinv pigcd poxedge ijthdfwd ijthsfwd ijthdrev ijthsrev xjbvd xjbvs
    bvd bvs jtss jtsd jtssws jtsswd jtsswgs jtsswgd jtweff njts njtssw njtsswg njtsd njtsswd njtsswgd xtss xtsd
    xtssws xtsswd xtsswgs xtsswgd tnjts tnjtssw tnjtsswg tnjtsd tnjtsswd tnjtsswgd vtss vtsd vtssws vtsswd vtsswgs
    vtsswgd gbmin rbdb rbpb rbsb rbps rbpd rbps0 rbpsl rbpsw rbpsnf rbpd0 rbpdl rbpdw rbpdnf rbpbx0 rbpbxl rbpbxw
    rbpbxnf rbpby0 rbpbyl rbpbyw rbpbynf rbsbx0 rbsby0 rbdbx0 rbdby0 rbsdbxl rbsdbxw rbsdbxnf rbsdbyl rbsdbyw
    rbsdbynf lcdsc lcdscb lcdscd lcit lnfactor lxj lvsat lat la0 lags la1 la2 lketa lnsub lndep lnsd lphin lngate
    lgamma1 lgamma2 lvbx lvbm lxt lk1 lkt1 lkt1l lkt2 lk2 lk3 lk3b lw0 ldvtp0 ldvtp1 ldvtp2 ldvtp3 ldvtp4 ldvtp5
    llpe0 llpeb ldvt0 ldvt1 ldvt2 ldvt0w ldvt1w ldvt2w ldrout ldsub lvth0 lvtho lua lua1 lub lub1 luc luc1 lud lud1
    lup llp lu0 lute lucste lvoff lminv lminvcv ldelta lrdsw lrsw lrdw lprwg lprwb lprt leta0 letab lpclm lpdiblc1
    lpdiblc2 lpdiblcb lfprout lpdits lpditsd lpscbe1 lpscbe2 lpvag lwr ldwg ldwb lb0 lb1 lcgsl lcgdl lckappas
    lckappad lcf lclc lcle lalpha0 lalpha1 lbeta0 lagidl lbgidl lcgidl lrgidl lkgidl lfgidl legidl lagisl lbgisl
    lcgisl lrgisl lkgisl lfgisl legisl laigc lbigc lcigc laigsd lbigsd lcigsd laigs lbigs lcigs laigd lbigd lcigd
    laigbacc lbigbacc lcigbacc laigbinv lbigbinv lcigbinv lnigc lnigbinv lnigbacc lntox leigbinv lpigcd lpoxedge
    lvfbcv lvfb lacde lmoin lnoff lvoffcv lxrcrg1 lxrcrg2 llambda lvtl lxn leu lucs lvfbsdoff ltvfbsdoff ltvoff
    ltnfactor lteta0 ltvoffcv wcdsc wcdscb wcdscd wcit wnfactor wxj wvsat wat wa0 wags wa1 wa2 wketa wnsub wndep
    wnsd wphin wngate wgamma1 wgamma2 wvbx wvbm wxt wk1 wkt1 wkt1l wkt2 wk2 wk3 wk3b ww0 wdvtp0 wdvtp1 wdvtp2 wdvtp3
    wdvtp4 wdvtp5 wlpe0 wlpeb wdvt0 wdvt1 wdvt2 wdvt0w wdvt1w wdvt2w wdrout wdsub wvth0 wvtho wua wua1 wub wub1 wuc
    wuc1 wud wud1 wup wlp wu0 wute wucste wvoff wminv wminvcv wdelta wrdsw wrsw wrdw wprwg wprwb wprt weta0 wetab
    wpclm wpdiblc1 wpdiblc2 wpdiblcb wfprout wpdits wpditsd wpscbe1 wpscbe2 wpvag wwr wdwg wdwb wb0 wb1 wcgsl wcgdl
    wckappas wckappad wcf wclc wcle walpha0 walpha1 wbeta0 wagidl wbgidl wcgidl wrgidl wkgidl wfgidl wegidl wagisl
    wbgisl wcgisl wrgisl wkgisl wfgisl wegisl waigc wbigc wcigc waigsd wbigsd wcigsd waigs wbigs wcigs waigd wbigd
    wcigd waigbacc wbigbacc wcigbacc waigbinv wbigbinv wcigbinv wnigc wnigbinv wnigbacc wntox weigbinv wpigcd
    wpoxedge wvfbcv wvfb wacde wmoin wnoff wvoffcv wxrcrg1 wxrcrg2 wlambda wvtl wxn weu wucs wvfbsdoff wtvfbsdoff
    wtvoff wtnfactor wteta0 wtvoffcv pcdsc pcdscb pcdscd pcit pnfactor pxj pvsat pat pa0 pags pa1 pa2 pketa pnsub
    pndep pnsd pphin pngate pgamma1 pgamma2 pvbx pvbm pxt pk1 pkt1 pkt1l pkt2 pk2 pk3 pk3b pw0 pdvtp0 pdvtp1 pdvtp2
    pdvtp3 pdvtp4 pdvtp5 plpe0 plpeb pdvt0 pdvt1 pdvt2 pdvt0w pdvt1w pdvt2w pdrout pdsub pvth0 pvtho pua pua1 pub
    pub1 puc puc1 pud pud1 pup plp pu0 pute pucste pvoff pminv pminvcv pdelta prdsw prsw prdw pprwg pprwb pprt peta0
    petab ppclm ppdiblc1 ppdiblc2 ppdiblcb pfprout ppdits ppditsd ppscbe1 ppscbe2 ppvag pwr pdwg pdwb pb0 pb1 pcgsl
    pcgdl pckappas pckappad pcf pclc pcle palpha0 palpha1 pbeta0 pagidl pbgidl pcgidl prgidl pkgidl pfgidl pegidl
    pagisl pbgisl pcgisl pegisl prgisl pkgisl pfgisl paigc pbigc pcigc paigsd pbigsd pcigsd paigs pbigs pcigs paigd
    pbigd pcigd paigbacc pbigbacc pcigbacc paigbinv pbigbinv pcigbinv pnigc pnigbinv pnigbacc pntox peigbinv ppigcd
    ppoxedge pvfbcv pvfb pacde pmoin pnoff pvoffcv pxrcrg1 pxrcrg2 plambda pvtl pxn peu pucs pvfbsdoff ptvfbsdoff
    ptvoff ptnfactor pteta0 ptvoffcv saref sbref wlod ku0 kvsat kvth0 tku0 llodku0 wlodku0 llodvth wlodvth lku0 wku0
    pku0 lkvth0 wkvth0 pkvth0 stk2 lodk2 steta0 lodeta0 web wec kvth0we k2we ku0we scref wpemod lkvth0we lk2we
    lku0we wkvth0we wk2we wku0we pkvth0we pk2we pku0we noia noib noic tnoia tnoib tnoic rnoia rnoib rnoic gidlclamp
    idovvds ntnoi em ef af kf vgs_max vgd_max vgb_max vds_max vbs_max vbd_max vgsr_max vgdr_max vgbr_max vbsr_max
    vbdr_max
    """
)
