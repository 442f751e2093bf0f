6-to-64 row decoder with word-line drivers
* An invented design, made up for evenstage; it belongs to no product and no process.
*
* a<5:0> --> true and complement buffers --> two 3-to-8 predecoders --> 16 lines across the
* array --> a NAND2 and a word-line driver in each of 64 rows, drawn once and called 64 times.
* The rows sit in eight banks; each bank takes all of pa<7:0> and one line of pb<7:0>.

* ---- leaf cells: one gate each, widths drawn in

.subckt abuf a y vdd vss                    $ address buffer, true or complement
mn y a vss vss nch w=1.2u l=0.13u ad=0.41p as=0.41p pd=1.88u ps=1.88u
mp y a vdd vdd pch w=2.4u l=0.13u ad=0.82p as=0.82p pd=3.08u ps=3.08u
.ends abuf

.subckt nand3 a b c y vdd vss
mn1 y  a n1  vss nch w=0.9u l=0.13u
mn2 n1 b n2  vss nch w=0.9u l=0.13u
mn3 n2 c vss vss nch w=0.9u l=0.13u
mp1 y  a vdd vdd pch w=0.8u l=0.13u
mp2 y  b vdd vdd pch w=0.8u l=0.13u
mp3 y  c vdd vdd pch w=0.8u l=0.13u
.ends nand3

.subckt pdrv a y vdd vss                    $ drives one predecoded line
mn y a vss vss nch w=0.7u l=0.13u
mp y a vdd vdd pch w=1.4u l=0.13u
.ends pdrv

.subckt rnand a b y vdd vss                 $ the row's own NAND
mn1 y  a n1  vss nch w=1.1u l=0.13u
mn2 n1 b vss vss nch w=1.1u l=0.13u
mp1 y  a vdd vdd pch w=1.1u l=0.13u
mp2 y  b vdd vdd pch w=1.1u l=0.13u
.ends rnand

.subckt wldrv a y vdd vss                   $ word-line driver
mn y a vss vss nch w=2.0u l=0.13u
mp y a vdd vdd pch w=4.0u l=0.13u
.ends wldrv

* ---- 3-to-8 predecoder: p<k> is high when a2 a1 a0 spell k

.subckt pre3to8 a0 a1 a2 p<0> p<1> p<2> p<3> p<4> p<5> p<6> p<7> vdd vss
xc0 a0  a0n vdd vss abuf
xc1 a1  a1n vdd vss abuf
xc2 a2  a2n vdd vss abuf
xt0 a0n a0t vdd vss abuf
xt1 a1n a1t vdd vss abuf
xt2 a2n a2t vdd vss abuf
xn0 a0n a1n a2n q<0> vdd vss nand3
xn1 a0t a1n a2n q<1> vdd vss nand3
xn2 a0n a1t a2n q<2> vdd vss nand3
xn3 a0t a1t a2n q<3> vdd vss nand3
xn4 a0n a1n a2t q<4> vdd vss nand3
xn5 a0t a1n a2t q<5> vdd vss nand3
xn6 a0n a1t a2t q<6> vdd vss nand3
xn7 a0t a1t a2t q<7> vdd vss nand3
xd0 q<0> p<0> vdd vss pdrv
xd1 q<1> p<1> vdd vss pdrv
xd2 q<2> p<2> vdd vss pdrv
xd3 q<3> p<3> vdd vss pdrv
xd4 q<4> p<4> vdd vss pdrv
xd5 q<5> p<5> vdd vss pdrv
xd6 q<6> p<6> vdd vss pdrv
xd7 q<7> p<7> vdd vss pdrv
.ends pre3to8

* ---- one row, and a bank of eight

.subckt row pa pb wl vdd vss
xnand pa pb wlb vdd vss rnand
xdrv wlb wl vdd vss wldrv
.ends row

.subckt bank pa<0> pa<1> pa<2> pa<3> pa<4> pa<5> pa<6> pa<7> pb
+ wl<0> wl<1> wl<2> wl<3> wl<4> wl<5> wl<6> wl<7> vdd vss
xrow0 pa<0> pb wl<0> vdd vss row
xrow1 pa<1> pb wl<1> vdd vss row
xrow2 pa<2> pb wl<2> vdd vss row
xrow3 pa<3> pb wl<3> vdd vss row
xrow4 pa<4> pb wl<4> vdd vss row
xrow5 pa<5> pb wl<5> vdd vss row
xrow6 pa<6> pb wl<6> vdd vss row
xrow7 pa<7> pb wl<7> vdd vss row
.ends bank

* ---- the decoder

.subckt rowdec a<0> a<1> a<2> a<3> a<4> a<5>
+ wl<0> wl<1> wl<2> wl<3> wl<4> wl<5> wl<6> wl<7>
+ wl<8> wl<9> wl<10> wl<11> wl<12> wl<13> wl<14> wl<15>
+ wl<16> wl<17> wl<18> wl<19> wl<20> wl<21> wl<22> wl<23>
+ wl<24> wl<25> wl<26> wl<27> wl<28> wl<29> wl<30> wl<31>
+ wl<32> wl<33> wl<34> wl<35> wl<36> wl<37> wl<38> wl<39>
+ wl<40> wl<41> wl<42> wl<43> wl<44> wl<45> wl<46> wl<47>
+ wl<48> wl<49> wl<50> wl<51> wl<52> wl<53> wl<54> wl<55>
+ wl<56> wl<57> wl<58> wl<59> wl<60> wl<61> wl<62> wl<63>
+ vdd vss

xpa a<0> a<1> a<2> pa<0> pa<1> pa<2> pa<3> pa<4> pa<5> pa<6> pa<7> vdd vss pre3to8
xpb a<3> a<4> a<5> pb<0> pb<1> pb<2> pb<3> pb<4> pb<5> pb<6> pb<7> vdd vss pre3to8

* wires: pa<*> run the height of the array, pb<*> only to their bank, the far ones longer
cpa0 pa<0> vss 26f
cpa1 pa<1> vss 26f
cpa2 pa<2> vss 26f
cpa3 pa<3> vss 26f
cpa4 pa<4> vss 26f
cpa5 pa<5> vss 26f
cpa6 pa<6> vss 26f
cpa7 pa<7> vss 26f
cpb0 pb<0> vss 6f
cpb1 pb<1> vss 8f
cpb2 pb<2> vss 10f
cpb3 pb<3> vss 12f
cpb4 pb<4> vss 14f
cpb5 pb<5> vss 16f
cpb6 pb<6> vss 18f
cpb7 pb<7> vss 20f

xbank0 pa<0> pa<1> pa<2> pa<3> pa<4> pa<5> pa<6> pa<7> pb<0>
+ wl<0> wl<1> wl<2> wl<3> wl<4> wl<5> wl<6> wl<7> vdd vss bank
xbank1 pa<0> pa<1> pa<2> pa<3> pa<4> pa<5> pa<6> pa<7> pb<1>
+ wl<8> wl<9> wl<10> wl<11> wl<12> wl<13> wl<14> wl<15> vdd vss bank
xbank2 pa<0> pa<1> pa<2> pa<3> pa<4> pa<5> pa<6> pa<7> pb<2>
+ wl<16> wl<17> wl<18> wl<19> wl<20> wl<21> wl<22> wl<23> vdd vss bank
xbank3 pa<0> pa<1> pa<2> pa<3> pa<4> pa<5> pa<6> pa<7> pb<3>
+ wl<24> wl<25> wl<26> wl<27> wl<28> wl<29> wl<30> wl<31> vdd vss bank
xbank4 pa<0> pa<1> pa<2> pa<3> pa<4> pa<5> pa<6> pa<7> pb<4>
+ wl<32> wl<33> wl<34> wl<35> wl<36> wl<37> wl<38> wl<39> vdd vss bank
xbank5 pa<0> pa<1> pa<2> pa<3> pa<4> pa<5> pa<6> pa<7> pb<5>
+ wl<40> wl<41> wl<42> wl<43> wl<44> wl<45> wl<46> wl<47> vdd vss bank
xbank6 pa<0> pa<1> pa<2> pa<3> pa<4> pa<5> pa<6> pa<7> pb<6>
+ wl<48> wl<49> wl<50> wl<51> wl<52> wl<53> wl<54> wl<55> vdd vss bank
xbank7 pa<0> pa<1> pa<2> pa<3> pa<4> pa<5> pa<6> pa<7> pb<7>
+ wl<56> wl<57> wl<58> wl<59> wl<60> wl<61> wl<62> wl<63> vdd vss bank
.ends rowdec
.end
