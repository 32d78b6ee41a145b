"""Boards that use one kind of element each: every letter with a small-signal meaning; ngspice reads all of them."""

from __future__ import annotations

ELEMENTS: dict[str, str] = {
    "controlled sources in every linear form": """controlled
V1 in 0 1 AC 1
VS s 0 0
R1 in s 1k
E1 e1 0 in 0 2
E2 e2 0 (in,0) 3
E3 e3 0 in 0 {2*2}
F1 0 f1 VS 2
F2 0 f2 VS {1+1} m=2
G1 0 g1 (in 0) 1m
G2 0 g2 in 0 1m m=3
H1 h1 0 VS 500
RE1 e1 0 1k
RE2 e2 0 1k
RE3 e3 0 1k
RF1 f1 0 1k
RF2 f2 0 1k
RG1 g1 0 1k
RG2 g2 0 1k
RH1 h1 0 1k
""",
    "controlled sources by polynomial": """polynomials
V1 in 0 0.5 AC 1
V2 b 0 0.3 AC 0 0
VS s 0 0
R1 in s 1k
E1 e1 0 POLY(1) in 0 0.1 2 3
E2 e2 0 POLY(2) (in,0) (b,0) 0 1 2 0.5 0.25 0.125
E3 e3 0 poly 1 in b 0 2
G1 0 g1 POLY(1) (in 0) 1m 2m
G2 0 g2 poly(2) in 0 b 0 0 1m 1m 0.5m
F1 0 f1 POLY(1) VS 0 2
H1 h1 0 POLY(1) VS 0.1 200 1k
RE1 e1 0 1k
RE2 e2 0 1k
RE3 e3 0 1k
RG1 g1 0 1k
RG2 g2 0 1k
RF1 f1 0 1k
RH1 h1 0 1k
""",
    "controlled sources by formula": """formulas
.param gain=2 ofs=0.25
V1 in 0 0.5 AC 1
VS s 0 0
R1 in s 1k
E1 e1 0 VALUE={gain*v(in)+ofs}
E2 e2 0 VALUE {v(in)^2}
E3 e3 0 value='exp(v(in))'
E4 e4 0 vol='v(in)*gain'
G1 0 g1 VALUE={v(in)*1m}
G2 0 g2 cur='v(in)*v(s,in)*1m+1m'
G3 0 g3 cur=tanh(v(in))*1m
RE1 e1 0 1k
RE2 e2 0 1k
RE3 e3 0 1k
RE4 e4 0 1k
RG1 g1 0 1k
RG2 g2 0 1k
RG3 g3 0 1k
""",
    "controlled sources by table": """tables
V1 in 0 0.5 AC 1
E1 e1 0 TABLE {v(in)} = (-1,-2) (0,0) (1,3)
E2 e2 0 table {v(in)*2} (-5,-5) (5,5)
G1 0 g1 TABLE {v(in)} = (-1,-1m) (1,1m)
RE1 e1 0 1k
RE2 e2 0 1k
RG1 g1 0 1k
""",
    "behavioural sources": """behaviour
.param k=3 half={1/2} name_1=2
V1 in 0 0.7 AC 1
VS s 0 0
R1 in s 1k
B1 b1 0 v=v(in)*k
B2 b2 0 V = {k}*V(in) + {half*2}
B3 b3 0 v='v(in)>0.5 ? v(in) : 0'
B4 b4 0 v="i(VS)*1k"
B5 0 b5 i=v(in)^2*1m
B6 0 b6 i = pow(v(in),2)*1m + pwr(-v(in),3)*1m m=1
B7 b7 0 v=v(in)-2^-1+-1*-v(s,in)
B8 b8 0 v=min(v(in),1)+max(0,v(in))+uramp(v(in))+u(v(in))+abs(-v(in))
B9 b9 0 v=pwl(v(in),-1,-2,0,0,1,4)
B10 b10 0 v=sqrt(v(in))+ln(v(in)+2)+log(v(in)+2)+log10(v(in)+2)+atan(v(in))+sgn(v(in))
B11 b11 0 v=temper/300+pi*v(in)+e+1mil*v(in)+1meg*1u
B12 b12 0 v=name_1*(v(in)+1)/(2-v(in)) tc1=1m
B13 b13 0 v=ternary_fcn(v(in)>1,1,v(in)*2)
B14 b14 0 v=!(v(in)>1)*v(in) + (v(in)>0.1 && v(in)<2 || 0)*v(in)
B15 b15 0 v=-v(in)**2
B16 b16 0 v=sin(v(in))*cos(v(in))+tan(v(in))+sinh(v(in))+cosh(v(in))+asin(v(in))+acos(v(in))+asinh(v(in))
+ +acosh(v(in)+1)+atanh(v(in))
B17 b17 0 v=u2(v(in))+floor(v(in))+ceil(v(in))+nint(v(in))+eq0(v(in))+ge0(v(in))
RB5 b5 0 1k
RB6 b6 0 1k
R2 b1 b2 1k
R3 b3 b4 1k
R4 b7 b8 1k
R5 b9 b10 1k
R6 b11 b12 1k
""",
    "node names in behavioural sources": """names
V1 in+ 0 0.7 AC 1
R1 in+ a-1 1k
R2 a-1 0 1k
B1 b1 0 v=v(in+)*2+v(a-1)+v( in+ , a-1 )
RB b1 0 1k
""",
    "passives with models and coefficients": """passives
.temp 60
V1 in 0 1 AC 1
R1 in a 1k tc1=1m tc2=2u
R2 a 0 1k tc=1m 2u
R3 in b thin 2k
R4 b 0 2k thin
R5 in c thin l=10u w=2u
R6 c 0 1k ac=2k
R7 in d 1k scale=2
R8 d 0 1k temp=100 tc1=1m
R9 in e 1k dtemp=20
R10 e 0 r=1k tc1=1m dtemp=20
R11 e 0 1k tce=0.1 m=2
R12 in f 1k noisy=0 m=2
R13 f 0 10k
C1 a 0 1n tc1=1m tc2=1u
C2 b 0 film l=10u w=4u
C3 c 0 1n film m=2
C4 d 0 1n ic=2 scale=3
C5 e 0 c=1n dtemp=10
L1 f 0 1m tc1=1m
L2 in f coil nt=10
L3 in f 1m scale=2 m=2
.model thin r (rsh=100 tc1=1m)
.model film c (cj=1m cjsw=1n tc1=1m)
.model coil l (ind=1u)
""",
    "behavioural passives": """passives
V1 in 0 1 AC 1
.param k=1k
R1 in a 'k*(1+v(in))'
R2 a 0 r={1k+100*v(a)}
R3 a 0 r = '1k*(2+v(in))'
R4 in b {1k*(1+temper/300)}
R5 b 0 1k
C1 a 0 c='1n*(1+v(in))'
C2 b 0 q='1n*v(b)+0.1n*v(b)^2'
L1 b 0 l='1m*(1+v(in))'
""",
    "diodes": """diodes
V1 in 0 0.8 AC 1
R1 in a 100
D1 a 0 dsmall
D2 a 0 dsmall area=2 m=2
D3 0 a dsmall off ic=0.2
D4 a 0 dsmall temp=60
X1 in cell
.subckt cell y
R1 y a 1k
D1 a 0 local
.model local d is=1e-15
.ends
.model dsmall d(is=1e-14 rs=2 cjo=2p tt=5n)
""",
    "field-effect transistors": """field effect
VDD vdd 0 5
V1 in 0 1.2 AC 1
R1 vdd d1 1k
M1 d1 in 0 0 nch l=2u w=20u ad=20p as=20p pd=22u ps=22u
M2 d2 in vdd vdd pch l=2u w=40u m=2
R2 d2 0 1k
J1 d3 g3 0 nj
J2 d3 g3 0 nj 2
R3 vdd d3 1k
R4 in g3 1meg
C4 in g3 1n
V3 g4 0 -1
J3 d3 g4 0 nj area=2 m=2
M3 d5 in 0 vd
R5 vdd d5 1k
M4 d5 in vdd vdp
Z1 d6 g4 0 mes
R6 vdd d6 1k
M5 d7 in 0 0 b3 l=1u w=10u nrd=1
R7 vdd d7 10k
M6 d8 in 0 0 b4 l=0.5u w=10u
R8 vdd d8 10k
.model nch nmos (level=1 vto=0.7 kp=100u gamma=0.4 lambda=0.05 cgso=0.3n cgdo=0.3n cj=0.3m)
.model pch pmos level=1, vto=-0.7, kp=40u
.model nj njf (vto=-2 beta=1m lambda=0.01 cgs=2p cgd=1p)
.model vd vdmos (vto=0.8 kp=0.1 cgs=10p)
.model vdp vdmos pchan vto=-0.8 kp=0.1
.model mes nmf (vto=-1.5 beta=1m)
.model b3 nmos level=8 version=3.3.0
.model b4 nmos level=14 version=4.8
""",
    "coupled inductors, switches and lines": """coupling
V1 in 0 1 AC 1
R1 in a 50
L1 a 0 1m
L2 b 0 4m
K1 L1 L2 0.9
R2 b 0 1k
VS s 0 0
R3 in s 1k
S1 in c in 0 sw1
S2 c 0 0 in sw1 off
W1 in d VS csw1 on
R4 c 0 10k
R5 d 0 10k
T1 in 0 t 0 z0=50 td=10n
R6 t 0 75
T2 in 0 t2 0 z0=75 f=10meg nl=0.25
R7 t2 0 75
O1 in 0 o 0 lossy
R8 o 0 75
U1 in u 0 urc1 l=1m
R9 u 0 1k
.model sw1 sw(vt=0.5 vh=0.1 ron=10 roff=1meg)
.model csw1 csw(it=0.1m ron=5 roff=1meg)
.model lossy ltra(r=0.2 l=250n c=100p len=2 g=0)
.model urc1 urc(k=2 fmax=1g rperl=1k cperl=1n)
""",
    "references inside instances": """instances
V1 in 0 1 AC 1
X1 in out sense
R9 out 0 1k
.subckt sense a y
VS a m 0
R1 m 0 1k
F1 0 y VS 2
H1 h 0 VS 100
R2 h y 1k
B1 0 y i=i(VS)*v(m,h)*1m
E1 k 0 vol='v(m)*2+v(a)'
R3 k y 1k
L1 y 0 1m
L2 n 0 1m
K1 L1 L2 0.5
R4 n 0 1k
.ends
""",
}
