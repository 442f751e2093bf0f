Tag comparator of a small cache: eight bits, two ways
* An invented design, made up for evenstage; it belongs to no product and no process.
*
* Each way: eight XNOR (a NAND2 and an OAI21 each), two NAND4, a NOR3 with the way's valid bit,
* and a driver that opens the way's data. t is looked up, u and v were stored; sel<i> is high
* where all eight bits agree and vldn<i> is low; hit joins both ways.
* Some widths are parameters of this file, and one of them serves more than one kind of gate.

.param lmin = 0.13u
.param wunit = 0.4u               $ nMOS of the smallest gate
.param wx  = {2*wunit}            $ OAI part of the XNOR
.param wdn = 1.6u  wdp = 3.4u     $ way driver, drawn before its load was known

.subckt inv a y vdd vss
mn y a vss vss nrg w=wunit l=lmin
mp y a vdd vdd prg w={2.1*wunit} l=lmin
.ends

* n = !(a b), e = !((a + b) n): high where a and b agree
.subckt xnor2 a b e vdd vss
mn1 n a x   vss nrg w=0.8u l=lmin
mn2 x b vss vss nrg w=0.8u l=lmin
mp1 n a vdd vdd prg w=0.8u l=lmin
mp2 n b vdd vdd prg w=0.8u l=lmin
mn3 t a vss vss nrg w=wx l=lmin
mn4 t b vss vss nrg w=wx l=lmin
mn5 e n t   vss nrg w=wx l=lmin
mp3 z a vdd vdd prg w={2*wx} l=lmin
mp4 e b z   vdd prg w={2*wx} l=lmin
mp5 e n vdd vdd prg w=wx l=lmin
.ends

.subckt nand4 a b c d y vdd vss
mn1 y  a x1  vss nrg w=1.2u l=lmin
mn2 x1 b x2  vss nrg w=1.2u l=lmin
mn3 x2 c x3  vss nrg w=1.2u l=lmin
mn4 x3 d vss vss nrg w=1.2u l=lmin
mp1 y a vdd vdd prg w=0.8u l=lmin
mp2 y b vdd vdd prg w=0.8u l=lmin
mp3 y c vdd vdd prg w=0.8u l=lmin
mp4 y d vdd vdd prg w=0.8u l=lmin
.ends

.subckt nor3 a b c y vdd vss
mn1 y a vss vss nrg w=0.5u l=lmin
mn2 y b vss vss nrg w=0.5u l=lmin
mn3 y c vss vss nrg w=0.5u l=lmin
mp1 x1 c vdd vdd prg w=2.8u l=lmin
mp2 x2 b x1  vdd prg w=2.8u l=lmin
mp3 y  a x2  vdd prg w=2.8u l=lmin
.ends

.subckt waydrv a y vdd vss
mn y a vss vss nrg w=wdn l=lmin
mp y a vdd vdd prg w=wdp l=lmin
.ends

.subckt nand2 a b y vdd vss
mn1 y a x   vss nrg w=1.0u l=lmin
mn2 x b vss vss nrg w=1.0u l=lmin
mp1 y a vdd vdd prg w=1.0u l=lmin
mp2 y b vdd vdd prg w=1.0u l=lmin
.ends

.subckt way
+ t<0> t<1> t<2> t<3> t<4> t<5> t<6> t<7>
+ s<0> s<1> s<2> s<3> s<4> s<5> s<6> s<7>
+ vldn sel hitn vdd vss
xe0 t<0> s<0> e<0> vdd vss xnor2
xe1 t<1> s<1> e<1> vdd vss xnor2
xe2 t<2> s<2> e<2> vdd vss xnor2
xe3 t<3> s<3> e<3> vdd vss xnor2
xe4 t<4> s<4> e<4> vdd vss xnor2
xe5 t<5> s<5> e<5> vdd vss xnor2
xe6 t<6> s<6> e<6> vdd vss xnor2
xe7 t<7> s<7> e<7> vdd vss xnor2
xlo e<0> e<1> e<2> e<3> lo vdd vss nand4
xhi e<4> e<5> e<6> e<7> hi vdd vss nand4
xj lo hi vldn eq vdd vss nor3
xinv eq hitn vdd vss inv
xdrv hitn sel vdd vss waydrv
cw hitn vss 6f                    $ hitn crosses the data array
.ends

.subckt tagcmp
+ t<0> t<1> t<2> t<3> t<4> t<5> t<6> t<7>
+ u<0> u<1> u<2> u<3> u<4> u<5> u<6> u<7>
+ v<0> v<1> v<2> v<3> v<4> v<5> v<6> v<7>
+ vldn<0> vldn<1> sel<0> sel<1> hit vdd vss
xway0 t<0> t<1> t<2> t<3> t<4> t<5> t<6> t<7>
+ u<0> u<1> u<2> u<3> u<4> u<5> u<6> u<7> vldn<0> sel<0> hn0 vdd vss way
xway1 t<0> t<1> t<2> t<3> t<4> t<5> t<6> t<7>
+ v<0> v<1> v<2> v<3> v<4> v<5> v<6> v<7> vldn<1> sel<1> hn1 vdd vss way
xhit hn0 hn1 hit vdd vss nand2
.ends
.end
