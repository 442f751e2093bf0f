Clock spine: root, spine, four branches, sixteen leaf drivers
* An invented design, made up for evenstage; it belongs to no product and no process.
*
*                       +-- north --+-- four leaf drivers
*  clk -- gate -- root -+-- east  --+-- ...
*                       +-- south --+
*                       +-- west  --+
*
* ce low stops the clock. Each leaf driver feeds a column of latches. The east branch was moved
* to the far side of the block late; its wire grew, its driver did not.
* Inverters are drawn in one finger size and multiplied.

.global vdd vss

.subckt ckinv a y                           $ one clock inverter, two fingers each
mn y a vss vss nlo w=1.2u l=0.09u nf=2 ad=0.17p as=0.34p pd=1.76u ps=3.52u
mp y a vdd vdd plo w=2.4u l=0.09u nf=2 ad=0.34p as=0.67p pd=2.96u ps=5.92u
.ends ckinv

.subckt ckgate ck ce y                      $ y = NOT (ck AND ce)
m1 y  ck ny  vss nlo w=3.0u l=0.09u nf=2
m2 ny ce vss vss nlo w=3.0u l=0.09u nf=2
m3 y  ck vdd vdd plo w=3.2u l=0.09u nf=2
m4 y  ce vdd vdd plo w=3.2u l=0.09u nf=2
.ends ckgate

.subckt branch a k<0> k<1> k<2> k<3>        $ branch wire and its four leaf drivers
cw a vss 14f
xl0 a k<0> ckinv m=3
xl1 a k<1> ckinv m=3
xl2 a k<2> ckinv m=3
xl3 a k<3> ckinv m=3
.ends branch

.subckt spine clk ce
+ kn<0> kn<1> kn<2> kn<3>  ke<0> ke<1> ke<2> ke<3>
+ ks<0> ks<1> ks<2> ks<3>  kw<0> kw<1> kw<2> kw<3>

xgate clk ce  r0  ckgate
xroot r0  r1      ckinv m=2
cw1 r1 vss 9f
xspin r1  r2      ckinv m=5

* the spine itself, 240 um, driven in its middle; wires 0.35 ohm and 0.2 fF per um
rs1 r2 r2:n 42
rs2 r2 r2:s 42
cs0 r2   vss 24f
cs1 r2:n vss 12f
cs2 r2:s vss 12f

* branch drivers; polarity: gate, root, spine, branch, leaf -- five inversions
xbn r2:n bn ckinv m=4
xbe r2:s be ckinv m=4
xbs r2:s bs ckinv m=4
xbw r2:n bw ckinv m=4
cbn bn vss 22f

* to the east 590 um; the others' 100 um or so are left as capacitance alone
re1 be   be:1 103
re2 be:1 be:2 103
ce0 be   vss 29f
ce1 be:1 vss 60f
ce2 be:2 vss 29f
cbs bs vss 19f
cbw bw vss 25f

xnorth bn kn<0> kn<1> kn<2> kn<3> branch
xeast  be:2 ke<0> ke<1> ke<2> ke<3> branch
xsouth bs ks<0> ks<1> ks<2> ks<3> branch
xwest  bw kw<0> kw<1> kw<2> kw<3> branch
.ends spine
.end
