Pre-driver of a three-state output pad
* An invented design, made up for evenstage; it belongs to no product and no process.
*
* d --+-- NAND2 (d, oe)  -- six inverters -->  pg, gate of the pad's pMOS, 900 um wide
*     +-- NOR2  (d, /oe) -- four inverters --> ng, gate of the pad's nMOS, 360 um wide
*
* The output transistors stand in the pad frame, outside this block; the brief gives what
* their gates weigh. oe low: pg high, ng low, the pad floats.
*
* Everything is built of three cells whose widths are passed by the caller.

.subckt inv a y vdd vss  wn=1.0u wp=2.4u
mn y a vss vss nio w=wn l=0.35u
mp y a vdd vdd pio w=wp l=0.35u
.ends inv

.subckt nand2 a b y vdd vss  wn=1.6u wp=2.0u
mna y  a ny  vss nio w=wn l=0.35u
mnb ny b vss vss nio w=wn l=0.35u
mpa y  a vdd vdd pio w=wp l=0.35u
mpb y  b vdd vdd pio w=wp l=0.35u
.ends nand2

.subckt nor2 a b y vdd vss  wn=1.0u wp=4.0u
mna y  a vss vss nio w=wn l=0.35u
mnb y  b vss vss nio w=wn l=0.35u
mpa py a vdd vdd pio w=wp l=0.35u
mpb y  b py  vdd pio w=wp l=0.35u
.ends nor2

.subckt predrv d oe pg ng vdd vss

* output enable, once as it is and once turned over
xoe1 oe   oeb  vdd vss inv wn=1.2u wp=2.8u

* pull-up side: the taper was drawn by eye; it dawdles for four stages and then has to jump
xp0 d oe p0  vdd vss nand2 wn=2.4u wp=3.0u
xp1 p0 p1    vdd vss inv   wn=1.6u wp=4.0u
xp2 p1 p2    vdd vss inv   wn=2.0u wp=5.0u
xp3 p2 p3    vdd vss inv   wn=2.6u wp=6.4u
xp4 p3 p4    vdd vss inv   wn=4.2u wp=10u
xp5 p4 p5    vdd vss inv   wn=9.0u wp=22u
xp6 p5 pg    vdd vss inv   wn=32u  wp=64u

* pull-down side: four inverters would do, but the last one has to swallow the whole step
xn0 d oeb n0 vdd vss nor2  wn=1.2u wp=5.6u
xn1 n0 n1    vdd vss inv   wn=1.8u wp=4.4u
xn2 n1 n2    vdd vss inv   wn=2.6u wp=6.2u
xn3 n2 n3    vdd vss inv   wn=4.0u wp=9.6u
xn4 n3 ng    vdd vss inv   wn=26u  wp=48u

* the long way to the output transistors
cpg pg vss 85f
cng ng vss 60f
.ends predrv
.end
