"""Boards that use one construct of the language each; ngspice reads all of them."""

from __future__ import annotations

MODEL = """.model nsmall npn (is=6e-15 bf=220 vaf=85 ikf=0.15 ise=8e-15 ne=1.6 br=4 var=20 rb=120 re=0.4 rc=3
+ cje=9p vje=0.72 mje=0.34 cjc=3.6p vjc=0.6 mjc=0.33 xcjc=0.7 tf=350p xtf=2 vtf=4 itf=0.2 tr=40n xtb=1.5)
"""

STAGE = """VCC vcc 0 12
VIN in 0 DC 0 AC 1
C1 in b 220n
R1 vcc b 47k
R2 b 0 12k
R3 vcc out 3.9k
R4 e 0 1.5k
C2 e 0 4.7u
Q1 out b e nsmall
"""

BOARDS: dict[str, str] = {
    "suffixes and unit tails": """gauge supply
V1 in 0 10Volt AC 1v
R1 in b 2.2kohm
R2 b c 1MegOhm
R3 c 0 4700
R4 b 0 +1.e4
R5 c 0 .5e5
C1 b 0 10nF
C2 c 0 4.7uF
C3 b c 22pF
C4 in c 1µF
L1 in d 10mH
R6 d 0 1k
R7 d 0 1e3k
""",
    "title that looks like a card, comments of every kind": """R9 in 0 1
* R8 in 0 1
V1 in 0 1 AC 1 ; the transducer
  * indented
R1 in out 1k // pad
; R8 in 0 2
// R8 in 0 3
R2 out 0 2k $ load
R3 out$x 0 5k
R4 out out$x 1k ,$ comma
C1 out 0 1n
""",
    "continuations over comments and blank lines": """continued
V1 in 0
+ 5
* between
+
+ AC

 + 1 45
R1 in
+out 1k
C1 out 0 \\\\
 1n
R2 out 0 1k
""",
    "odd node names": """names
V1 in 0 12 AC 1
R0 in +12V 1k
R1 +12V net-_c6-pad1_ 1k
R2 net-_c6-pad1_ a[1] 1k
R3 a[1] n/1 1k
R4 n/1 #5 1k
R5 #5 1e3 1k
R6 1e3 GND 1k
R7 a<1> gnd 1k
R8 a<1> n:1 1k
R9 n:1 +12v 2k
R10 x%y n/1 1k
R11 x%y 00 1k
R12 00 0 3k
C1 A[1] 0 1n
""",
    "parentheses and commas round nodes": """blanks
V1 (in,0) DC 1 AC 1
R1 (in a) 1k
R2 a,0,5k
G1 (out 0) (a,0) 2m
R3 out 0 1k
C1 out 0 1n
""",
    "parameters in any order, in braces, quotes and bare": """parameters
.param rload={base*2} cl = 'cin/2' gain=2m*1.5
V1 in 0 {vdc} AC 1
R1 in out rload
R2 out 0 {rload/4}
R3 out 0 r='base+1k'
C1 out 0 c={cl}
G1 0 out in 0 gain
.param base=1k vdc=(1 + 2)*2 cin=4n
.param hyp='sqrt(base**2+1meg)' small={max(1,2)*1u}
R4 out 0 hyp
C2 out 0 small
""",
    "conditions and functions": """formulas
.param a=3 b=-2
V1 in 0 {a>2 ? 5 : 1} AC {abs(b)}
R1 in x {1k*pow(a,2)}
R2 x 0 {1k*(b^2)}
R3 x 0 {ternary_fcn(a==3 && b<0, 1k, 2k)}
R4 x 0 {(7\\2+5%3)*1k}
R5 x 0 {(a<>b)*1k + !a + nint(2.5)}
R6 x 0 {2*-2^2*1k}
R7 x 0 {-b^2*-1k}
C1 x 0 {exp(-ln(1e9))}
""",
    "sources in any order": """sources
V1 in 0 AC 1 45 DC 2
V2 b 0 SIN(0.5 1 1k) AC 0.5
V3 c 0 pulse 1 2 0 1n 1n 1u 2u DC 3
V4 d 0 dc=4 ac=1
V5 e 0 dc(5) ac(1 30)
V6 f 0 PULSE(1.5 3 0 1n 1n 1u 2u)
V7 g 0 (PWL 0 0.25 1 1) (AC 1v)
V8 h 0 pwl(-1 0 1 1)
V9 k 0 AC
V10 l 0 EXP(0.1 2 1u 1u)
V11 m 0 SFFM(0.2 1 1k 5 100)
V12 n 0 sin(1 2 1k 0 0 30)
I1 0 p DC 1m AC 1m 90
I2 0 p ac 2m
I3 0 q 1m m=3
V13 r 0
V14 s 0 {2*3}
R1 in b 1k
R2 b c 1k
R3 c d 1k
R4 d e 1k
R5 e f 1k
R6 f g 1k
R7 g h 1k
R8 h k 1k
R9 k l 1k
R10 l m 1k
R11 m n 1k
R12 p 0 1k
R13 q 0 1k
R14 r s 1k
R15 n p 10k
""",
    "multiplicity on R, C, L, G, Q": "multiples\n"
    + STAGE
    + MODEL
    + """R5 out x 1k m=2
C5 x 0 100p m=3
L5 x y 1u m=4
R6 y 0 1k
G1 y 0 b 0 1m m=2
Q2 out b e2 nsmall m=2
R7 e2 0 2k
""",
    "transistors: area, substrate, temperature, off": "areas\n"
    + STAGE
    + MODEL
    + """Q2 vcc out e2 0 nsmall 2
R5 e2 0 1k
Q3 vcc b e3 nsmall area=0.5 temp=60
R6 e3 0 1k
Q4 vcc b e4 nsmall dtemp=10 off
R7 e4 0 1k
Q5 vcc b e5 0 nsmall area=3 areab=2 areac=4 ic=0.7,5
R8 e5 0 1k
Q6 e6 b vcc psmall
R9 e6 0 1k
.model psmall pnp is=9e-15, bf=160 vaf 45 cje = 11p cjc=5.2p tf=600p subs=1
""",
    "temperature cards and options": "temperature\n"
    + STAGE
    + MODEL
    + """.options reltol=1e-3 temp=40 tnom=25 gmin=1e-10 method=gear
.temp 60
.opt abstol=1p nopage
""",
    "subcircuits: nested, with parameters and local models": """nested
VCC vcc 0 12
VIN in 0 DC 0 AC 1
X1 in o1 vcc stage params: rc=3.3k
X2 o1 o2 vcc stage rc={rc0} ce=10u
X3 o2 out buffer k={2*1}
.param rc0=4.7k
.subckt stage (a y sup) rc=1k ce=1u
+ re={rc/3}
C1 a b 1u
R1 sup b 56k
R2 b 0 12k
R3 sup y rc
Q1 y b e nloc
X1 e emitter r={re} c={ce}
.subckt emitter n r=1 c=1u
R1 n 0 {r}
C1 n 0 {c}
.ends emitter
.param unused={rc*2}
.model nloc npn (is=6e-15 bf={bf0*2} cje=9p cjc=3p tf=300p)
.ends stage
.param bf0=100
.subckt buffer a y params: k=1
.param r1={k*1k}
R1 a mid r1
R2 mid y {k*1k}
C1 mid gnd 1n
R3 y 0 10k
.ends
""",
    "m on X": """copies
V1 in 0 1 AC 1
X1 in out cell m=3
.subckt cell a y
R1 a y 1k
C1 y 0 1n
G1 0 y a 0 1m
I1 0 y 1u
L1 y k 1m
R2 k 0 2k
.ends
""",
    "global nodes win over ports": """globals
.global vdd VSS
VDD vdd 0 5
VSS vss 0 -5
V1 in 0 0 AC 1
X1 in out vdd cell
.subckt cell a y vdd
R1 a y 1k
R2 y vdd 2k
R3 y vss 3k
C1 y 0 1n
.ends
""",
    "a subcircuit's node reached from outside": """reach
V1 in 0 1 AC 1
X1 in out cell
R9 x1.mid 0 1k
.subckt cell a y
R1 a mid 1k
R2 mid y 1k
C1 y 0 1n
.ends
""",
    "scopes are dynamic and a given value is read in the called subcircuit": """scopes
.param a=1 k=2
V1 in 0 1 AC 1
X1 in o1 outer a=10
X2 in o2 outer a=20
X7 in o7 body
X3 in o3 sub p={a*40}
X4 in o4 sub p={a*40} a=3
X5 in o5 sub a={a+1}
X6 in o6 own k={k}
.subckt outer n y a=5
X1 n y body
.ends
.subckt body n y
R1 n y {a*1k}
R2 y 0 {k*1k}
.ends
.subckt sub n y p=10 a=7
R1 n y {p*10}
R2 y 0 {a*1k}
.ends
.subckt own n y k=9
R1 n y {k*1k}
R2 y 0 1k
.ends
""",
    "a parameter's own name means the one outside": """own names
.param a=2 p=4
V1 in 0 1 AC 1
X1 in o1 local
X2 in o2 default
X3 in o3 given p=p
X4 in o4 given p={p*2}
X5 in o5 given p=a
X6 in o6 early a=3
.subckt local n y
.param a={a+1}
R1 n y {a*1k}
R2 y 0 1k
.ends
.subckt default n y a={a}
R1 n y {a*1k}
R2 y 0 1k
.ends
.subckt given n y p=1 a=7
R1 n y {p*1k}
R2 y 0 1k
.ends
.subckt early n y a=2
.param a=5
R1 n y {a*1k}
R2 y 0 1k
.ends
""",
    "definitions of subcircuits twice, nested, as macro, and a port called 0": """definitions
V1 in 0 1 AC 1
X1 in o1 s
X2 in o2 outer
X3 in o3 mac
X4 in o4 vv low
X5.a in o5 s
R0 vv in 1k
R1 o1 0 1k
R2 o2 0 1k
R3 o3 0 1k
R5 o5 0 1k
.subckt s n y
R1 n m 1k
R2 m y 1k
.ends
.subckt s n y
R1 n y 5k
.ends
.subckt outer n y
.subckt s a b
R1 a b 3k
.ends
X1 n y s
.ends
.macro mac a b
R1 a b 1k
.eom
.subckt low n y 0
R1 n y 1k
R2 y 0 2k
.ends
""",
    "extremes: no inductance, no capacitance, a very small resistor": """extremes
V1 in 0 1 AC 1
R1 in a 1e-5
L1 a out 0
C1 out 0 0
R2 out 0 1k
""",
    "time functions with all their arguments": """functions
V1 in 0 SIN(1 2 1k 1m 0 30) AC 1
V2 b 0 EXP(1 2 1u 1u 2u 1u)
V3 c 0 AM(1 0.5 1k 10k 0)
V4 d 0 SFFM(0.2 1 1k 5 100 30 40)
V5 e 0 PWL(0 1 1m 2) r=0
V6 f 0 PWL(0 1 1m 2) td=1m
V7 g 0 PWL(1 1 2 2)
R1 in b 1k
R2 b c 1k
R3 c d 1k
R4 d e 1k
R5 e f 1k
R6 f g 1k
""",
    "analyses, outputs and a script are read past": "hints\n"
    + STAGE
    + MODEL
    + """.ac dec 10 1 1g
.tran 1u 1m
.print ac v(out)
.ic v(out)=3
.save all
""",
    "cards behind .end are read": "behind\n" + STAGE + ".end\nRX out 0 10k\n" + MODEL,
    "of two models and two parameters of one name": "twice\n"
    + STAGE.replace("R4 e 0 1.5k", "R4 e 0 {r}")
    + MODEL
    + ".model nsmall npn (is=1e-14 bf=50)\n.param r=1k\n.param r=2k\n",
    "upper case everywhere": "UPPER\n" + (STAGE + MODEL).upper(),
}
