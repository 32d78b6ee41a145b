"""Parameters that ngspice's compact models accept on a model card, as the engine itself lists them (devhelp)."""

from __future__ import annotations

from tauledger.devices.family import names

# bipolar transistor, levels 4 and 9
VBIC = names(
    """
    tnom tref rcx rci vo gamm hrcf rbx rbi re rs rbp is nf nr fc cbeo cje pe me aje cbco cjc qco cjep pc mc ajc
    cjcp ps ms ajs ibei wbe nei iben nen ibci nci ibcn ncn avc1 avc2 isp wsp nfp ibeip ibenp ibcip ncip ibcnp ncnp
    vef ver ikf ikr ikp tf qtf xtf vtf itf tr td kfn afn bfn xre xrb xrbi xrc xrci xrs xvo ea eaie eaic eais eane
    eanc eans xis xii xin tnf tavc rth cth vrt art ccso qbm nkf xikf xrcx xrbx xrbp isrr xisr dear eap vbbe nbbe
    ibbe tvbbe1 tvbbe2 tnbbe ebbe dtemp vers vref vbe_max vbc_max vce_max
    """
)
# bipolar transistor, level 8
HICUM = names(
    """
    tnom tref version c10 qp0 ich hf0 hfe hfc hjei ahjei rhjei hjci ibeis mbei ireis mrei ibeps mbep ireps mrep
    mcf tbhrec ibcis mbci ibcxs mbcx ibets abet tunode favl qavl kavl alfav alqav alkav rbi0 rbx fgeo fdqr0 fcrbi
    fqi re rcx itss msf iscs msc tsf rsu csu cjei0 vdei zei ajei aljei cjep0 vdep zep ajep aljep cjci0 vdci zci
    vptci cjcx0 vdcx zcx vptcx fbcpar fbc fbepar fbe cjs0 vds zs vpts cscp0 vdsp zsp vptsp t0 dt0h tbvl tef0 gtfe
    thcs ahc alhc fthc rci0 vlim vces vpt aick delck tr vcbar icbar acbar cbepar ceox cbcpar ccox alqf alit flnqs
    kf af cfbe flcono kfre afre latb latl vgb alt0 kt0 zetaci alvs alces zetarbi zetarbx zetarcx zetare zetacx vge
    vgc vgs f1vg f2vg zetact zetabet alb dvgbe zetahjei zetavgbe flsh rth zetarth alrth cth flcomp vbe_max vbc_max
    vce_max
    """
)
# MESFET, level 1
MESFET = names(
    """
    vt0 vto alpha beta lambda b rd rs cgs cgd pb is fc kf af
    """
)
# MESFET, levels 2 to 4
MESFET_A = names(
    """
    vto vt0 lambda lambdahf beta vs rd rs rg ri rf rdi rsi phib phib1 tphib astar ggr del xchi tggr n eta m mc
    alpha sigma0 vsigmat vsigma mu theta mu1 mu2 d nd du ndu th ndelta delta tc tvto alphat tlambda teta0 teta1
    tmu xtm0 xtm1 xtm2 ks vsg tf flo delfo ag rtc1 rtc2 zeta nmax gamma epsi cas cbs
    """
)
# heterostructure FET, level 5
HFET_1 = names(
    """
    vt0 vto lambda rd rs rg rdi rsi rgs rgd ri rf eta m mc gamma sigma0 vsigmat vsigma mu di delta vs nmax deltad
    js1d js2d js1s js2s m1d m2d m1s m2s epsi p cm3 a1 a2 mv1 kappa delf fgds tf cds phib talpha mt1 mt2 ck1 ck2
    cm1 cm2 astar eta1 d1 vt1 eta2 d2 vt2 ggr del gatemod klambda kmu kvto
    """
)
# heterostructure FET, level 6
HFET_2 = names(
    """
    cf d1 d2 del delta deltad di epsi eta eta1 eta2 gamma ggr js klambda kmu knmax kvto lambda m mc mu n nmax p rd
    rdi rs rsi sigma0 vs vsigma vsigmat vt0 vto vt1 vt2
    """
)
# MOS transistor, level 4
BSIM1 = names(
    """
    vfb lvfb wvfb phi lphi wphi k1 lk1 wk1 k2 lk2 wk2 eta leta weta x2e lx2e wx2e x3e lx3e wx3e dl dw muz x2mz
    lx2mz wx2mz mus lmus wmus x2ms lx2ms wx2ms x3ms lx3ms wx3ms u0 lu0 wu0 x2u0 lx2u0 wx2u0 u1 lu1 wu1 x2u1 lx2u1
    wx2u1 x3u1 lx3u1 wx3u1 n0 ln0 wn0 nb lnb wnb nd lnd wnd tox temp vdd cgso cgdo cgbo xpart rsh js pb mj pbsw
    mjsw cj cjsw wdf dell kf af
    """
)
# MOS transistor, level 5
BSIM2 = names(
    """
    vfb lvfb wvfb phi lphi wphi k1 lk1 wk1 k2 lk2 wk2 eta0 leta0 weta0 etab letab wetab dl dw mu0 mu0b lmu0b wmu0b
    mus0 lmus0 wmus0 musb lmusb wmusb mu20 lmu20 wmu20 mu2b lmu2b wmu2b mu2g lmu2g wmu2g mu30 lmu30 wmu30 mu3b
    lmu3b wmu3b mu3g lmu3g wmu3g mu40 lmu40 wmu40 mu4b lmu4b wmu4b mu4g lmu4g wmu4g ua0 lua0 wua0 uab luab wuab
    ub0 lub0 wub0 ubb lubb wubb u10 lu10 wu10 u1b lu1b wu1b u1d lu1d wu1d n0 ln0 wn0 nb lnb wnb nd lnd wnd vof0
    lvof0 wvof0 vofb lvofb wvofb vofd lvofd wvofd ai0 lai0 wai0 aib laib waib bi0 lbi0 wbi0 bib lbib wbib vghigh
    lvghigh wvghigh vglow lvglow wvglow tox temp vdd vgg vbb cgso cgdo cgbo xpart rsh js pb mj pbsw mjsw cj cjsw
    wdf dell kf af
    """
)
# MOS transistor on insulator, levels 10 and 58
BSIM_SOI = names(
    """
    mtrlmod vgstcvmod gidlmod iiimod eot epsrox epsrsub ni0sub bg0sub tbgasub tbgbsub phig easub leffeot weffeot
    vddeot tempeot ados bdos epsrgate capmod mobmod paramchk binunit version tox toxp toxm dtoxcv cdsc cdscb cdscd
    cit nfactor vsat at a0 ags a1 a2 keta nsub nch ngate nsd gamma1 gamma2 vbx vbm xt k1 kt1 kt1l kt2 k2 k3 k3b w0
    lpe0 lpeb dvt0 dvt1 dvt2 dvt0w dvt1w dvt2w drout dsub vth0 vtho vfb ua ua1 ub ub1 uc uc1 u0 eu ute ucs ucste
    ud ud1 voff tnom cgso cgdo xpart delta rsh rdsw rsw rdw rswmin rdwmin prwg prwb prt eta0 etab pclm pdiblc1
    pdiblc2 pdiblcb pvag shmod tbox tsi etsi xj rth0 cth0 cfrcoeff egidl agidl bgidl cgidl rgidl kgidl fgidl egisl
    agisl bgisl cgisl rgisl kgisl fgisl ndiode ndioded xbjt xdif xrec xtun xdifd xrecd xtund pbswg pbswgd mjswg
    mjswgd cjswg cjswgd lint ll llc lln lw lwc lwn lwl lwlc wr wint dwg dwb wl wlc wln ww wwc wwn wwl wwlc b0 b1
    cgsl cgdl ckappa cf clc cle dwc dlc alpha0 noia noib noic fnoimod tnoimod tnoia tnoib rnoia rnoib ntnoi saref
    sbref wlod ku0 kvsat kvth0 tku0 llodku0 wlodku0 llodvth wlodvth lku0 wku0 pku0 lkvth0 wkvth0 pkvth0 stk2 lodk2
    steta0 lodeta0 gbmin rbdb rbsb bf w0flk frbody dvtp0 ldvtp0 wdvtp0 pdvtp0 dvtp1 ldvtp1 wdvtp1 pdvtp1 dvtp2
    ldvtp2 wdvtp2 pdvtp2 dvtp3 ldvtp3 wdvtp3 pdvtp3 dvtp4 ldvtp4 wdvtp4 pdvtp4 minv lminv wminv pminv pdits pditsl
    pditsd fprout lfprout lpdits lpditsd wfprout wpdits wpditsd pfprout ppdits ppditsd em ef af kf noif k1w1 k1w2
    ketas dwbc beta0 beta1 beta2 vdsatii0 tii lii sii0 sii1 sii2 siid fbjtii ebjtii cbjtii vbci abjtii mbjtii
    tvbci esatii ntun ntund nrecf0 nrecf0d nrecr0 nrecr0d isbjt idbjt isdif iddif isrec idrec istun idtun ln vrec0
    vrec0d vtun0 vtun0d nbjt lbjt0 ldif0 vabjt aely ahli ahlid rbody rbsh cgeo tt ndif vsdfb vsdth csdmin asd
    csdesw ntrecf ntrecr dlcb fbody tcjswg tpbswg tcjswgd tpbswgd acde moin noff delvt kb1 dlbg igmod igbmod
    igcmod toxqm wth0 rhalo ntox toxref ebg vevb alphagb1 betagb1 vgb1 vecb alphagb2 betagb2 vgb2 aigbcp2 bigbcp2
    cigbcp2 voxh deltavox aigc bigc cigc aigsd bigsd cigsd nigc pigcd poxedge dlcig soimod vbs0pd vbs0fd vbsa
    nofffd vofffd k1b k2b dk2b dvbd0 dvbd1 moinfd rgatemod xrcrg1 xrcrg2 rshg ngcon xgw xgl rbodymod rdsmod fdmod
    vsce cdsbs minvcv lminvcv wminvcv pminvcv voffcv lvoffcv wvoffcv pvoffcv lxj lalphagb1 lbetagb1 lalphagb2
    lbetagb2 laigbcp2 lbigbcp2 lcigbcp2 lcgsl lcgdl lckappa lndif lute lkt1 lkt1l lkt2 lua1 lub1 luc1 lat lprt
    lntrecf lntrecr lxbjt lxdif lxrec lxtun lxdifd lxrecd lxtund laigc lbigc lcigc laigsd lbigsd lcigsd lnigc
    lpigcd lpoxedge lnch lnsub lngate lnsd lvth0 lvfb lk1 lk1w1 lk1w2 lk2 lk3 lk3b lkb1 lw0 llpe0 llpeb ldvt0
    ldvt1 ldvt2 ldvt0w ldvt1w ldvt2w lu0 leu lua lub luc lud lud1 lucste lucs lvsat la0 lags lb0 lb1 lketa lketas
    la1 la2 lrdsw lrsw lrdw lprwb lprwg lwr lnfactor ldwg ldwb lvoff leta0 letab ldsub lcit lcdsc lcdscb lcdscd
    lpclm lpdiblc1 lpdiblc2 lpdiblcb ldrout lpvag ldelta lalpha0 lfbjtii labjtii lcbjtii lebjtii lmbjtii lvbci
    lbeta0 lbeta1 lbeta2 lvdsatii0 llii lesatii lsii0 lsii1 lsii2 lsiid lagidl lbgidl lcgidl legidl lrgidl lkgidl
    lfgidl lagisl lbgisl lcgisl legisl lrgisl lkgisl lfgisl lntun lntund lndiode lndioded lnrecf0 lnrecf0d lnrecr0
    lnrecr0d lisbjt lidbjt lisdif liddif lisrec lidrec listun lidtun lvrec0 lvrec0d lvtun0 lvtun0d lnbjt llbjt0
    lvabjt laely lahli lahlid lvsdfb lvsdth ldelvt lacde lmoin lnoff lxrcrg1 lxrcrg2 wxj walphagb1 wbetagb1
    walphagb2 wbetagb2 waigbcp2 wbigbcp2 wcigbcp2 wcgsl wcgdl wckappa wndif wute wkt1 wkt1l wkt2 wua1 wub1 wuc1
    wat wprt wntrecf wntrecr wxbjt wxdif wxrec wxtun wxdifd wxrecd wxtund waigc wbigc wcigc waigsd wbigsd wcigsd
    wnigc wpigcd wpoxedge wnch wnsub wngate wnsd wvth0 wvfb wk1 wk1w1 wk1w2 wk2 wk3 wk3b wkb1 ww0 wlpe0 wlpeb
    wdvt0 wdvt1 wdvt2 wdvt0w wdvt1w wdvt2w wu0 weu wua wub wuc wud wud1 wucste wucs wvsat wa0 wags wb0 wb1 wketa
    wketas wa1 wa2 wrdsw wrsw wrdw wprwb wprwg wwr wnfactor wdwg wdwb wvoff weta0 wetab wdsub wcit wcdsc wcdscb
    wcdscd wpclm wpdiblc1 wpdiblc2 wpdiblcb wdrout wpvag wdelta walpha0 wfbjtii wabjtii wcbjtii webjtii wmbjtii
    wvbci wbeta0 wbeta1 wbeta2 wvdsatii0 wlii wesatii wsii0 wsii1 wsii2 wsiid wagidl wbgidl wcgidl wegidl wrgidl
    wkgidl wfgidl wagisl wbgisl wcgisl wegisl wrgisl wkgisl wfgisl wntun wntund wndiode wndioded wnrecf0 wnrecf0d
    wnrecr0 wnrecr0d wisbjt widbjt wisdif widdif wisrec widrec wistun widtun wvrec0 wvrec0d wvtun0 wvtun0d wnbjt
    wlbjt0 wvabjt waely wahli wahlid wvsdfb wvsdth wdelvt wacde wmoin wnoff wxrcrg1 wxrcrg2 pxj palphagb1 pbetagb1
    palphagb2 pbetagb2 paigbcp2 pbigbcp2 pcigbcp2 pcgsl pcgdl pckappa pndif pute pkt1 pkt1l pkt2 pua1 pub1 puc1
    pat pprt pntrecf pntrecr pxbjt pxdif pxrec pxtun pxdifd pxrecd pxtund paigc pbigc pcigc paigsd pbigsd pcigsd
    pnigc ppigcd ppoxedge pnch pnsub pnsd pngate pvth0 pvfb pk1 pk1w1 pk1w2 pk2 pk3 pk3b pkb1 pw0 plpe0 plpeb
    pdvt0 pdvt1 pdvt2 pdvt0w pdvt1w pdvt2w pu0 peu pua pub puc pud pud1 pucste pucs pvsat pa0 pags pb0 pb1 pketa
    pketas pa1 pa2 prdsw prsw prdw pprwb pprwg pwr pnfactor pdwg pdwb pvoff peta0 petab pdsub pcit pcdsc pcdscb
    pcdscd ppclm ppdiblc1 ppdiblc2 ppdiblcb pdrout ppvag pdelta palpha0 pfbjtii pabjtii pcbjtii pebjtii pmbjtii
    pvbci pbeta0 pbeta1 pbeta2 pvdsatii0 plii pesatii psii0 psii1 psii2 psiid pagidl pbgidl pcgidl pegidl prgidl
    pkgidl pfgidl pagisl pbgisl pcgisl pegisl prgisl pkgisl pfgisl pntun pntund pndiode pndioded pnrecf0 pnrecf0d
    pnrecr0 pnrecr0d pisbjt pidbjt pisdif piddif pisrec pidrec pistun pidtun pvrec0 pvrec0d pvtun0 pvtun0d pnbjt
    plbjt0 pvabjt paely pahli pahlid pvsdfb pvsdth pdelvt pacde pmoin pnoff pxrcrg1 pxrcrg2 nlx lnlx wnlx pnlx
    ngidl lngidl wngidl pngidl vgs_max vgd_max vgb_max vds_max vbs_max vbd_max vgsr_max vgdr_max vgbr_max vbsr_max
    vbdr_max
    """
)
# MOS transistor, level 68
HISIM2 = names(
    """
    info noise version show corsrd corg coiprv copprv coadov coisub coiigs cogidl coovlp coflick coisti conqs
    corbnet cothrml coign codfm corecip coqy coqovsm coerrrep codep coddlt vmax bgtmp1 bgtmp2 eg0 tox xld lover
    ddltmax ddltslp ddltict vfbover nover xwd xl xw saref sbref ll lld lln wl wl1 wl1p wl2 wl2p wld wln xqy xqy1
    xqy2 qyrat rs rd rsh rshg vfbc vbi nsubc vfbcl vfbclp parl2 lp nsubp nsubpl nsubpfac nsubpdlt nsubpw nsubpwp
    scp1 scp2 scp3 sc1 sc2 sc3 sc4 pgd1 pgd2 pgd4 ndep ndepl ndeplp ndepw ndepwp ninv ninvd ninvdl ninvdlp muecb0
    muecb1 mueph0 mueph1 muephw muepwp muepwd muephl mueplp muepld muephs muepsp vtmp wvth0 muesr0 muesr1 muesrl
    muesrw mueswp mueslp muetmp bb sub1 sub2 svgs svbs svbsl svds slg sub1l sub2l svgsl svgslp svgswp svgsw svbslp
    slgl slglp sub1lp nsti wsti wstil wstilp wstiw wstiwp scsti1 scsti2 vthsti vdsti muesti1 muesti2 muesti3
    nsubpsti1 nsubpsti2 nsubpsti3 nsubcsti1 nsubcsti2 nsubcsti3 lpext npext npextw npextwp scp22 scp21 bs1 bs2
    cgso cgdo cgbo tpoly js0 js0sw nj njsw xti cj cjsw cjswg mj mjsw mjswg pb pbsw pbswg tcjbd tcjbs tcjbdsw
    tcjbssw tcjbdswg tcjbsswg xti2 cisb cvb ctemp cisbk cvbk divx clm1 clm2 clm3 clm5 clm6 vover voverp vovers
    voversp wfc nsubcw nsubcwp nsubcmax qme1 qme2 qme3 gidl1 gidl2 gidl3 gidl4 gidl5 gidl6 gidl7 gleak1 gleak2
    gleak3 gleak4 gleak5 gleak6 gleak7 glksd1 glksd2 glksd3 glkb1 glkb2 glkb3 egig igtemp2 igtemp3 vzadd0 pzadd0
    nftrp nfalp falph cit kappa vdiffj dly1 dly2 dly3 tnom ovslp ovmag gbmin rbpb rbpd rbps rbdb rbsb ibpc1 ibpc2
    mphdfm ptl ptp pt2 ptlp gdl gdlp gdld pt4 pt4p muephl2 mueplp2 nsubcw2 nsubcwp2 muephw2 muepwp2 web wec
    nsubcwpe npextwpe nsubpwpe vgsmin sc3vbs byptol muecb0lp muecb1lp ndepm ndepml ndepmlp tndep depleak depleakl
    depleaklp depeta depmue0 depmue0l depmue0lp depmue1 depmue1l depmue1lp depmueback0 depmueback0l depmueback0lp
    depmueback1 depmueback1l depmueback1lp depmueph0 depmueph1 depvmax depvmaxl depvmaxlp depvdsef1 depvdsef1l
    depvdsef1lp depvdsef2 depvdsef2l depvdsef2lp depbb depmuetmp lmin lmax wmin wmax lbinn wbinn lvmax lbgtmp1
    lbgtmp2 leg0 llover lvfbover lnover lwl2 lvfbc lnsubc lnsubp lscp1 lscp2 lscp3 lsc1 lsc2 lsc3 lsc4 lpgd1 lndep
    lninv lmuecb0 lmuecb1 lmueph1 lvtmp lwvth0 lmuesr1 lmuetmp lsub1 lsub2 lsvds lsvbs lsvgs lnsti lwsti lscsti1
    lscsti2 lvthsti lmuesti1 lmuesti2 lmuesti3 lnsubpsti1 lnsubpsti2 lnsubpsti3 lnsubcsti1 lnsubcsti2 lnsubcsti3
    lcgso lcgdo ljs0 ljs0sw lnj lcisbk lclm1 lclm2 lclm3 lwfc lgidl1 lgidl2 lgleak1 lgleak2 lgleak3 lgleak6
    lglksd1 lglksd2 lglkb1 lglkb2 lnftrp lnfalp lvdiffj libpc1 libpc2 wvmax wbgtmp1 wbgtmp2 weg0 wlover wvfbover
    wnover wwl2 wvfbc wnsubc wnsubp wscp1 wscp2 wscp3 wsc1 wsc2 wsc3 wsc4 wpgd1 wndep wninv wmuecb0 wmuecb1
    wmueph1 wvtmp wwvth0 wmuesr1 wmuetmp wsub1 wsub2 wsvds wsvbs wsvgs wnsti wwsti wscsti1 wscsti2 wvthsti
    wmuesti1 wmuesti2 wmuesti3 wnsubpsti1 wnsubpsti2 wnsubpsti3 wnsubcsti1 wnsubcsti2 wnsubcsti3 wcgso wcgdo wjs0
    wjs0sw wnj wcisbk wclm1 wclm2 wclm3 wwfc wgidl1 wgidl2 wgleak1 wgleak2 wgleak3 wgleak6 wglksd1 wglksd2 wglkb1
    wglkb2 wnftrp wnfalp wvdiffj wibpc1 wibpc2 pvmax pbgtmp1 pbgtmp2 peg0 plover pvfbover pnover pwl2 pvfbc pnsubc
    pnsubp pscp1 pscp2 pscp3 psc1 psc2 psc3 psc4 ppgd1 pndep pninv pmuecb0 pmuecb1 pmueph1 pvtmp pwvth0 pmuesr1
    pmuetmp psub1 psub2 psvds psvbs psvgs pnsti pwsti pscsti1 pscsti2 pvthsti pmuesti1 pmuesti2 pmuesti3
    pnsubpsti1 pnsubpsti2 pnsubpsti3 pnsubcsti1 pnsubcsti2 pnsubcsti3 pcgso pcgdo pjs0 pjs0sw pnj pcisbk pclm1
    pclm2 pclm3 pwfc pgidl1 pgidl2 pgleak1 pgleak2 pgleak3 pgleak6 pglksd1 pglksd2 pglkb1 pglkb2 pnftrp pnfalp
    pvdiffj pibpc1 pibpc2 vgs_max vgd_max vgb_max vds_max vbs_max vbd_max vgsr_max vgdr_max vgbr_max vbsr_max
    vbdr_max
    """
)
