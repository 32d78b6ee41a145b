"""Boards that use what the language has beside cards: functions, conditions, sections, bins; ngspice reads all."""

from __future__ import annotations

LANGUAGE: dict[str, str] = {
    "functions of the user's own": """functions
.param c=3
.func sq(x) {x*x}
.func plus(x,y) = {sq(x)+y*c}
.func k2() '2*c'
.param hyp(a,b)='sqrt(a*a+b*b)'
V1 in 0 2 AC 1
R1 in a {1k*plus(2,1)}
R2 a 0 {hyp(3,4)*1k}
B1 b 0 v=sq(v(in))+k2()
E1 e 0 vol='plus(v(in),1)'
R3 b e 1k
X1 in y cell c=10
.subckt cell a y c=1
.func loc(x) {x*c}
R1 a y {loc(100)}
R2 y 0 {sq(c)}
B1 q 0 v=loc(v(a))
R3 q 0 1k
.ends
""",
    "conditions": """conditions
.param n=2 deep=1
V1 in 0 1 AC 1
.if (n==2)
R1 in a 1k
.if (deep > 0)
C1 a 0 1n
.else
C1 a 0 2n
.endif
.elseif (n=3)
R1 in a 2k
.else
R1 in a 3k
.endif
R2 a 0 5k
X1 in b cell kind=1
X2 in c cell kind=2
X3 in d cell
.subckt cell i o kind=0
.if(kind==1)
R1 i o 1k
.elseif(kind==2)
R1 i o 2k
.model local d is=1e-12
.else
R1 i o 4k
.model local d is=1e-15
.endif
D1 o 0 glob
R2 o 0 1k
.ends
.if (n<2)
.model glob d is=1e-12
.temp 80
.else
.model glob d is=1e-15
.endif
""",
    "cards that no condition touches": """collected first
.param n=2
V1 in 0 1 AC 1
.if (n==2)
.param load=5k
.func g(x) {x*1k}
.subckt tail a
R1 a 0 1k
.ends
.else
.param load=7k
.func g(x) {x*2k}
.subckt tail a
R1 a 0 10k
.ends
.endif
R1 in a {g(1)}
R2 a 0 {load}
X4 a tail
""",
    "binned models": """bins
VDD vdd 0 3
V1 in 0 1.2 AC 1
M1 a in 0 0 nch l=0.5u w=5u
R1 vdd a 10k
M2 b in 0 0 nch l=2u w=5u
R2 vdd b 10k
M4 d in 0 0 nch l=1u w=5u
R4 vdd d 10k
M5 e in 0 0 fin l=0.1u w=10u nf=4
R5 vdd e 10k
X1 in f cell
R6 vdd f 10k
.subckt cell g d
M1 d g 0 0 nch l=1.5u w=5u
M2 d g 0 0 own l=1.5u w=5u
.model own.1 nmos level=8 version=3.3.0 lmin=1u lmax=2u wmin=1u wmax=100u vth0=0.9
.ends
.model nch.1 nmos level=8 version=3.3.0 lmin=0.1u lmax=1u wmin=1u wmax=100u vth0=0.5
.model nch.2 nmos level=8 version=3.3.0 lmin=1u lmax=10u wmin=1u wmax=100u vth0=0.8
.model fin.1 nmos level=14 version=4.8 lmin=0.05u lmax=1u wmin=1u wmax=5u vth0=0.4
.model fin.2 nmos level=14 version=4.8 lmin=0.05u lmax=1u wmin=5u wmax=100u vth0=0.7
""",
    "sizes under an option": """scaled
.options scale=1u
VDD vdd 0 3
V1 in 0 1.2 AC 1
M1 a in 0 0 n1 l=2 w=20 ad=20 as=20 pd=20 ps=20
R1 vdd a 10k
M2 b in 0 0 n8 l=2 w=20 ad=20 as=20 pd=20 ps=20
R2 vdd b 10k
M3 c in 0 0 n14 l=2 w=20 ad=20 as=20 pd=20 ps=20 sa=2 sb=2
R3 vdd c 10k
R4 in d rr l=10 w=2
R5 d 0 1k
C1 in f cc l=10 w=2
R7 f 0 1k
C2 in f 1n
.model rr r rsh=100
.model cc c cj=1m
.model n1 nmos level=1 kp=100u vto=0.7 cj=1m cjsw=1n
.model n8 nmos level=8 version=3.3.0
.model n14 nmos level=14
""",
    "starting voltages choose the state": """bistable
V1 vcc 0 5 AC 1
R1 vcc a 1k
R2 vcc b 1k
X1 a b latch
.param high=5
.subckt latch a b
Q1 a bb 0 q
Q2 b ab 0 q
R3 a ab 10k
R4 b bb 10k
.nodeset v(ab)=1
.ends
.ic v(a)=0 v(b)=5
.nodeset v(a)={high} V(b) = 0 v(x1.bb)=0
.model q npn bf=100
""",
    "global nodes win over ports": """globals
V1 vdd 0 3 AC 1
R1 vdd a 1k
X1 a vee cell
R2 vee 0 3k
.global vdd
.global vee sub!
R3 sub! 0 1k
.subckt cell y vdd
R1 y vdd 1k
R2 y sub! 2k
.ends
""",
    "where ngspice surprises": """surprises
.param neg=-2 p=1 p=2
V1 in 0 1 AC 1
R1 in a 1k5
R2 a 0 2n2F m=1e12
R3 in b {pow(neg,2)*1k}
R4 b 0 {1k*(neg^3)}
R5 in c {pwr(neg,3)*100 + 1mil*1meg}
R6 c 0 {p*1k}
R7 in d 1mil
R8 d 0 1m
R9 in e dup
R10 e 0 {1k*(neg)**2}
X1 in f pair
R11 f 0 1k
B1 g 0 v=pow(-2,3)+pwr(-2,3)
R12 g 0 1k
.model dup r rsh=1 l=10u w=1u
.model dup r rsh=2 l=10u w=1u
.subckt pair a y
R1 a y 1k
.ends
.subckt pair a y
R1 a y 2k
.ends
.end
R13 f 0 3k
""",
    "a resistor of nothing and noise sources": """nothing
V1 in 0 DC 1 TRNOISE(1m 1n 0 0) AC 1
V2 c 0 trnoise(20n 0.5n 0 0)
V3 d 0 DC 2 trrandom(2 10m 0 1 2)
R1 in a 0
R2 a 0 1k
R3 c d 1k
R4 a b 0 m=2
R5 b 0 1
""",
    "shunts at every node": """shunts
.options rshunt=1e9 cshunt=10p
VCC vcc 0 12
VIN in 0 AC 1
C1 in b 220n
R1 vcc b 470k
X1 b out vcc stage
R2 b 0 120k
.subckt stage b c vcc
R3 vcc c 39k
R4 e 0 15k
Q1 c b e nsmall
.ends
.model nsmall npn (is=6e-15 bf=220 vaf=85 cje=9p cjc=3.6p tf=350p)
""",
}
