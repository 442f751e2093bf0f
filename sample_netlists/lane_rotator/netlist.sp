* Rotator for eight lanes: turns a word left by 0 to 7 places, in transmission gates
* An invented design, made up for evenstage; it belongs to no product and no process.
*
* d<i> --> input driver --> three ranks of two-way selectors (by 1, by 2, by 4) --> output driver
* --> q<i>, in phase. Each rank has its two select lines driven across all lanes from one pin.
* To find: the first driver of each line is strong and the second weak, and the output drivers
* are wider than what the last rank can move.

* data driver: what it moves lies behind three transmission gates
.subckt lanedrv a y vdd vss
mn y a vss vss nch w=0.8u l=0.13u
mp y a vdd vdd pch w=1.6u l=0.13u
.ends

* two-way selector: x where s is low, y where it is high
.subckt sel x y z s sb vdd vss
mn1 x sb z vss nch w=0.9u l=0.13u
mp1 x s z vdd pch w=0.9u l=0.13u
mn2 y s z vss nch w=0.9u l=0.13u
mp2 y sb z vdd pch w=0.9u l=0.13u
.ends

* both phases of a select line, for eight selectors each
.subckt seldrv s sl slb vdd vss
mn1 slb s vss vss nch w=1.4u l=0.13u
mp1 slb s vdd vdd pch w=2.8u l=0.13u
mn2 sl slb vss vss nch w=0.7u l=0.13u
mp2 sl slb vdd vdd pch w=1.4u l=0.13u
.ends

* receiver and output driver of a lane
.subckt laneout z q vdd vss
mn1 zb z vss vss nch w=2.0u l=0.13u
mp1 zb z vdd vdd pch w=4.0u l=0.13u
mn2 zc zb vss vss nch w=2.4u l=0.13u
mp2 zc zb vdd vdd pch w=4.8u l=0.13u
mn3 q zc vss vss nch w=4.0u l=0.13u
mp3 q zc vdd vdd pch w=8.0u l=0.13u
.ends

.subckt rotator s0 s1 s2
+ d<0> d<1> d<2> d<3> d<4> d<5> d<6> d<7>
+ q<0> q<1> q<2> q<3> q<4> q<5> q<6> q<7>
+ vdd vss
xs0 s0 l0 lb0 vdd vss seldrv
xs1 s1 l1 lb1 vdd vss seldrv
xs2 s2 l2 lb2 vdd vss seldrv
xd0 d<0> a<0> vdd vss lanedrv
xd1 d<1> a<1> vdd vss lanedrv
xd2 d<2> a<2> vdd vss lanedrv
xd3 d<3> a<3> vdd vss lanedrv
xd4 d<4> a<4> vdd vss lanedrv
xd5 d<5> a<5> vdd vss lanedrv
xd6 d<6> a<6> vdd vss lanedrv
xd7 d<7> a<7> vdd vss lanedrv
* by 1
xr0_0 a<0> a<7> b<0> l0 lb0 vdd vss sel
xr0_1 a<1> a<0> b<1> l0 lb0 vdd vss sel
xr0_2 a<2> a<1> b<2> l0 lb0 vdd vss sel
xr0_3 a<3> a<2> b<3> l0 lb0 vdd vss sel
xr0_4 a<4> a<3> b<4> l0 lb0 vdd vss sel
xr0_5 a<5> a<4> b<5> l0 lb0 vdd vss sel
xr0_6 a<6> a<5> b<6> l0 lb0 vdd vss sel
xr0_7 a<7> a<6> b<7> l0 lb0 vdd vss sel
* by 2
xr1_0 b<0> b<6> c<0> l1 lb1 vdd vss sel
xr1_1 b<1> b<7> c<1> l1 lb1 vdd vss sel
xr1_2 b<2> b<0> c<2> l1 lb1 vdd vss sel
xr1_3 b<3> b<1> c<3> l1 lb1 vdd vss sel
xr1_4 b<4> b<2> c<4> l1 lb1 vdd vss sel
xr1_5 b<5> b<3> c<5> l1 lb1 vdd vss sel
xr1_6 b<6> b<4> c<6> l1 lb1 vdd vss sel
xr1_7 b<7> b<5> c<7> l1 lb1 vdd vss sel
* by 4
xr2_0 c<0> c<4> e<0> l2 lb2 vdd vss sel
xr2_1 c<1> c<5> e<1> l2 lb2 vdd vss sel
xr2_2 c<2> c<6> e<2> l2 lb2 vdd vss sel
xr2_3 c<3> c<7> e<3> l2 lb2 vdd vss sel
xr2_4 c<4> c<0> e<4> l2 lb2 vdd vss sel
xr2_5 c<5> c<1> e<5> l2 lb2 vdd vss sel
xr2_6 c<6> c<2> e<6> l2 lb2 vdd vss sel
xr2_7 c<7> c<3> e<7> l2 lb2 vdd vss sel
* wires: the select lines, and the lanes; one that wraps around runs back across all others
cl0 l0 0 4f
clb0 lb0 0 4f
cl1 l1 0 4f
clb1 lb1 0 4f
cl2 l2 0 4f
clb2 lb2 0 4f
cb0 b<0> 0 3.4f
cb1 b<1> 0 3.4f
cb2 b<2> 0 3.4f
cb3 b<3> 0 3.4f
cb4 b<4> 0 3.4f
cb5 b<5> 0 3.4f
cb6 b<6> 0 6.9f
cb7 b<7> 0 6.9f
cc0 c<0> 0 5.8f
cc1 c<1> 0 5.8f
cc2 c<2> 0 5.8f
cc3 c<3> 0 5.8f
cc4 c<4> 0 8.8f
cc5 c<5> 0 8.8f
cc6 c<6> 0 8.8f
cc7 c<7> 0 8.8f
ce0 e<0> 0 2f
ce1 e<1> 0 2f
ce2 e<2> 0 2f
ce3 e<3> 0 2f
ce4 e<4> 0 2f
ce5 e<5> 0 2f
ce6 e<6> 0 2f
ce7 e<7> 0 2f
xq0 e<0> q<0> vdd vss laneout
xq1 e<1> q<1> vdd vss laneout
xq2 e<2> q<2> vdd vss laneout
xq3 e<3> q<3> vdd vss laneout
xq4 e<4> q<4> vdd vss laneout
xq5 e<5> q<5> vdd vss laneout
xq6 e<6> q<6> vdd vss laneout
xq7 e<7> q<7> vdd vss laneout
.ends
.end
