* Four-way multiplexer for an eight-bit bus, select lines decoded inside
* An invented design, made up for evenstage; it belongs to no product and no process.
*
* s1 s0 --> four select lines across the bus --> AOI22, AOI22, NAND2 and a driver in each bit.
* q<i> is the inverse of word s1 s0 of (a, b, c, d). Extracted from a layout editor that wraps
* every transistor in a subcircuit and writes plain numbers, microns all of them.

.subckt inv a y vdd vss
xm1 y a vss vss nx18 w=0.9 l=0.18
xm2 y a vdd vdd px18 w=2.0 l=0.18
.ends

.subckt seldrv a y vdd vss
xm1 y a vss vss nx18 w=1.4 l=0.18
xm2 y a vdd vdd px18 w=3.0 l=0.18
.ends

.subckt nor2 a b y vdd vss
xm1 y a vss vss nx18 w=0.8 l=0.18
xm2 y b vss vss nx18 w=0.8 l=0.18
xm3 n1 a vdd vdd px18 w=3.2 l=0.18
xm4 y b n1 vdd px18 w=3.2 l=0.18
.ends

.subckt nand2 a b y vdd vss
xm1 y a n1 vss nx18 w=1.2 l=0.18
xm2 n1 b vss vss nx18 w=1.2 l=0.18
xm3 y a vdd vdd px18 w=1.3 l=0.18
xm4 y b vdd vdd px18 w=1.3 l=0.18
.ends

.subckt aoi22 a0 a1 b0 b1 y vdd vss
xm1 y  a0 n1  vss nx18 w=2.0 l=0.18
xm2 n1 a1 vss vss nx18 w=2.0 l=0.18
xm3 y  b0 n2  vss nx18 w=2.0 l=0.18
xm4 n2 b1 vss vss nx18 w=2.0 l=0.18
xm5 p1 a0 vdd vdd px18 w=4.0 l=0.18
xm6 p1 a1 vdd vdd px18 w=4.0 l=0.18
xm7 y  b0 p1  vdd px18 w=4.0 l=0.18
xm8 y  b1 p1  vdd px18 w=4.0 l=0.18
.ends

.subckt outdrv a y vdd vss
xm1 y a vss vss nx18 w=3.0 l=0.18
xm2 y a vdd vdd px18 w=6.6 l=0.18
.ends

* one bit; the data gates are far wider than the little they drive
.subckt muxbit a b c d sa sb sc sd q vdd vss
xab a sa b sb u vdd vss aoi22
xcd c sc d sd v vdd vss aoi22
xor u v y vdd vss nand2
xdr y q vdd vss outdrv
.ends

.subckt busmux s0 s1
+ a<0> a<1> a<2> a<3> a<4> a<5> a<6> a<7>
+ b<0> b<1> b<2> b<3> b<4> b<5> b<6> b<7>
+ c<0> c<1> c<2> c<3> c<4> c<5> c<6> c<7>
+ d<0> d<1> d<2> d<3> d<4> d<5> d<6> d<7>
+ q<0> q<1> q<2> q<3> q<4> q<5> q<6> q<7>
+ vdd vss

* select: true and complement, decoded with NOR gates, driven across the bus
xi0 s0  s0b vdd vss inv
xi1 s1  s1b vdd vss inv
xt0 s0b s0t vdd vss inv
xt1 s1b s1t vdd vss inv
xna s1t s0t na vdd vss nor2
xnb s1t s0b nb vdd vss nor2
xnc s1b s0t nc vdd vss nor2
xnd s1b s0b nd vdd vss nor2
xka na ka vdd vss inv
xkb nb kb vdd vss inv
xkc nc kc vdd vss inv
xkd nd kd vdd vss inv
xda ka sa vdd vss seldrv
xdb kb sb vdd vss seldrv
xdc kc sc vdd vss seldrv
xdd kd sd vdd vss seldrv

* 40 um of wire each
ca sa vss 9.5f
cb sb vss 9.5f
cc sc vss 9.5f
cd sd vss 9.5f

xb0 a<0> b<0> c<0> d<0> sa sb sc sd q<0> vdd vss muxbit
xb1 a<1> b<1> c<1> d<1> sa sb sc sd q<1> vdd vss muxbit
xb2 a<2> b<2> c<2> d<2> sa sb sc sd q<2> vdd vss muxbit
xb3 a<3> b<3> c<3> d<3> sa sb sc sd q<3> vdd vss muxbit
xb4 a<4> b<4> c<4> d<4> sa sb sc sd q<4> vdd vss muxbit
xb5 a<5> b<5> c<5> d<5> sa sb sc sd q<5> vdd vss muxbit
xb6 a<6> b<6> c<6> d<6> sa sb sc sd q<6> vdd vss muxbit
xb7 a<7> b<7> c<7> d<7> sa sb sc sd q<7> vdd vss muxbit
.ends
