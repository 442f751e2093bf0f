Eight-bit ripple adder, carry chain of AOI and OAI gates in turn
* An invented design, made up for evenstage; it belongs to no product and no process.
*
* The carry changes polarity from bit to bit, so no inverter stands in its way:
*   even bit, carry true:        con = !(g + p ci)      AOI21, g = a b, p = a + b
*   odd bit, carry complemented: co  = !(gn (pn + cin)) OAI21, gn = !(a b), pn = !(a + b)
* Sums are AOI/OAI gates too. An even and an odd bit make a pair; the adder is four of these.
*
* Every cell takes its drive strength k; 1 is 0.5 um of nMOS.

.param wn='0.5u' wp='1.1u' lg=0.13u

.subckt inv a y vdd vss  k=1
mn y a vss vss nch w='wn*k' l=lg
mp y a vdd vdd pch w='wp*k' l=lg
.ends inv

.subckt nand2 a b y vdd vss  k=1
mn1 y a x   vss nch w='2*wn*k' l=lg
mn2 x b vss vss nch w='2*wn*k' l=lg
mp1 y a vdd vdd pch w='wp*k' l=lg
mp2 y b vdd vdd pch w='wp*k' l=lg
.ends nand2

.subckt nor2 a b y vdd vss  k=1
mn1 y a vss vss nch w='wn*k' l=lg
mn2 y b vss vss nch w='wn*k' l=lg
mp1 x a vdd vdd pch w='2*wp*k' l=lg
mp2 y b x   vdd pch w='2*wp*k' l=lg
.ends nor2

* y = !(a b + c); c stands next to the output, where the late signal belongs
.subckt aoi21 a b c y vdd vss  k=1
mn1 y a x   vss nch w='2*wn*k' l=lg
mn2 x b vss vss nch w='2*wn*k' l=lg
mn3 y c vss vss nch w='wn*k' l=lg
mp1 z a vdd vdd pch w='2*wp*k' l=lg
mp2 z b vdd vdd pch w='2*wp*k' l=lg
mp3 y c z   vdd pch w='2*wp*k' l=lg
.ends aoi21

* y = !((a + b) c)
.subckt oai21 a b c y vdd vss  k=1
mn1 x a vss vss nch w='2*wn*k' l=lg
mn2 x b vss vss nch w='2*wn*k' l=lg
mn3 y c x   vss nch w='2*wn*k' l=lg
mp1 z a vdd vdd pch w='2*wp*k' l=lg
mp2 y b z   vdd pch w='2*wp*k' l=lg
mp3 y c vdd vdd pch w='wp*k' l=lg
.ends oai21

* carry in true, carry out complemented
.subckt evenbit a b ci con s vdd vss
xgn a b gn vdd vss nand2 k=1
xpn a b pn vdd vss nor2 k=1
xg gn g vdd vss inv k=1
xp pn p vdd vss inv k=1
xcarry ci p g con vdd vss aoi21 k=1
xx a b pn x vdd vss aoi21 k=1            $ x = a xor b
xn x ci n vdd vss nor2 k=3               $ sum, s = x xor ci; three times what it needs
xs x ci n s vdd vss aoi21 k=3
.ends evenbit

* carry in complemented, carry out true
.subckt oddbit a b cin co s vdd vss
xgn a b gn vdd vss nand2 k=1
xpn a b pn vdd vss nor2 k=1
xcarry cin pn gn co vdd vss oai21 k=1
xx a b pn x vdd vss aoi21 k=1
xn x cin n vdd vss nand2 k=3             $ sum, s = !(x xor cin)
xs x cin n s vdd vss oai21 k=3
.ends oddbit

.subckt pair a<0> b<0> a<1> b<1> ci co s<0> s<1> vdd vss
xeven a<0> b<0> ci cn s<0> vdd vss evenbit
xodd  a<1> b<1> cn co s<1> vdd vss oddbit
cn cn vss 1.2f
co co vss 1.2f
.ends pair

.subckt add8
+ a<0> a<1> a<2> a<3> a<4> a<5> a<6> a<7>
+ b<0> b<1> b<2> b<3> b<4> b<5> b<6> b<7>
+ cin
+ s<0> s<1> s<2> s<3> s<4> s<5> s<6> s<7>
+ cout
+ vdd vss
xp0 a<0> b<0> a<1> b<1> cin c2 s<0> s<1> vdd vss pair
xp1 a<2> b<2> a<3> b<3> c2 c4 s<2> s<3> vdd vss pair
xp2 a<4> b<4> a<5> b<5> c4 c6 s<4> s<5> vdd vss pair
xp3 a<6> b<6> a<7> b<7> c6 c8 s<6> s<7> vdd vss pair
* carry out is buffered for the neighbour
xo1 c8 c8n vdd vss inv k=1
xo2 c8n cout vdd vss inv k=2
.ends add8
.end
