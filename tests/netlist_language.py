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
}
