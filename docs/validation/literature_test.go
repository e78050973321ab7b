package validation

// crawler2 is the mover in the plane.
const crawler2 = `
slow x in [0, 1] periodic
slow y in [0, 1] periodic
fast theta on circle
param D = 0.8 positive
function v(x, y) positive
dx     = v*cos(theta)/eps dt
dy     = v*sin(theta)/eps dt
dtheta = sqrt(2*D)/eps dW1
`

// spherical are the equations of rotational diffusion.
const spherical = `
fast (a, b, c) on sphere
param D = 0.8 positive
da = -2*D*a/eps^2 dt + sqrt(2*D)/eps*(b dW13 - c dW12)
db = -2*D*b/eps^2 dt + sqrt(2*D)/eps*(c dW11 - a dW13)
dc = -2*D*c/eps^2 dt + sqrt(2*D)/eps*(a dW12 - b dW11)
`

// supply is a square-root process with a slow variable that does not matter.
const supply = `
slow x on line
fast y on halfline
param a = 1.2 positive
param m = 0.9 positive
param s = 0.7 positive
dx = -x dt
dy = a*(m - y)/eps dt + s*sqrt(y/eps) dW1
let shape = 2*a*m/s^2
let scale = s^2/(2*a)
`

const fraction = `
slow x on line
fast y in [0, 1] reflecting
param k = 1.2 positive
param m = 0.3 positive
param s = 0.7 positive
dx = -x dt
dy = k*(m - y)/eps dt + s*sqrt(y*(1 - y)/eps) dW1
let p = 2*k*m/s^2
let q = 2*k*(1 - m)/s^2
`

// slit is a tracer between plates; u is the profile.
const slit = `
slow x on line
fast y in [0, h] reflecting
param h = 1.3 positive
param U = 2
param kappa = 0.4 positive
dy = sqrt(2*kappa)/eps dW2
`

var publishedResults = []published{
	{
		title:  "Active mover in two dimensions",
		source: "M.E. Cates, J. Tailleur, EPL 101 (2013) 20010: diffusivity v^2/(d(d-1)D_r), drift velocity V with V/D_eff = -grad ln v, so that the Ito drift is V + grad D_eff; density 1/v: M.J. Schnitzer, Phys. Rev. E 48 (1993) 2553 (from memory)",
		model:  crawler2,
		checks: []check{
			{"diffusion x x", "2*(v^2/(2*D))"},
			{"diffusion x y", "0"},
			{"drift x", "-v^2/(2*D)*diff(log(v), x) + diff(v^2/(2*D), x)"},
			{"drift y", "-v^2/(2*D)*diff(log(v), y) + diff(v^2/(2*D), y)"},
			{"density", "1/v"},
		},
	},
	{
		title:  "Active mover in three dimensions",
		source: "M.E. Cates, J. Tailleur, EPL 101 (2013) 20010, as above with d = 3 (from memory)",
		model: `
slow x in [0, 1] periodic
slow y in [0, 1] periodic
slow z in [0, 1] periodic
function v(x, y, z) positive
dx = v*a/eps dt
dy = v*b/eps dt
dz = v*c/eps dt
` + spherical,
		checks: []check{
			{"diffusion x x", "2*(v^2/(6*D))"},
			{"diffusion x z", "0"},
			{"drift z", "-v^2/(6*D)*diff(log(v), z) + diff(v^2/(6*D), z)"},
			{"density", "1/v"},
		},
	},
	{
		title:  "Circle swimmer",
		source: "S. van Teeffelen, H. Loewen, Phys. Rev. E 78 (2008) 020101: D_eff = v^2 D_r/(2(D_r^2 + omega^2)) (from memory)",
		model: `
slow x on line
slow y on line
fast theta on circle
param D = 0.8 positive
param omega = 1.5
param v = 1.1 positive
dx     = v*cos(theta)/eps dt
dy     = v*sin(theta)/eps dt
dtheta = omega/eps^2 dt + sqrt(2*D)/eps dW1
`,
		checks: []check{
			{"diffusion x x", "2*(v^2*D/(2*(D^2 + omega^2)))"},
			{"diffusion x y", "0"},
			{"drift x", "0"},
		},
	},
	{
		title:  "Persistent random walk",
		source: "R. Fuerth, Z. Phys. 2 (1920) 244; G.I. Taylor, Proc. London Math. Soc. 20 (1921) 196: D_eff = <u^2>*tau (from memory)",
		model: `
slow x on line
fast u on line
param tau = 0.7 positive
param V = 1.3 positive
dx = u/eps dt
du = -u/(tau*eps^2) dt + V*sqrt(2/tau)/eps dW1
`,
		checks: []check{
			{"mean u^2", "V^2"},
			{"diffusion x x", "2*(V^2*tau)"},
			{"drift x", "0"},
		},
	},
	{
		title:  "Coloured noise with a graded strength",
		source: "E. Wong, M. Zakai, Ann. Math. Stat. 36 (1965) 1560: smooth noise becomes Stratonovich noise; G.A. Pavliotis, A.M. Stuart, Multiscale Methods (2008), section 11.7 (from memory): dX = b dt + (s/a) g o dW",
		model: `
slow x on line
fast y on line
param a = 1.2 positive
param s = 0.7 positive
function g(x) positive
function b(x)
dx = b dt + g*y/eps dt
dy = -a*y/eps^2 dt + s/eps dW1
`,
		checks: []check{
			{"drift x", "b + 1/2*(s/a*g)*diff(s/a*g, x)"},
			{"diffusion x x", "(s/a*g)^2"},
			{"noise x 1", "s/a*g"},
		},
	},
	{
		title:  "Noise read in the Stratonovich sense",
		source: "C. Gardiner, Stochastic Methods (2009), section 4.3: the Ito drift is f + 1/2 sigma sigma' (from memory)",
		model: `
calculus stratonovich
slow x on line
fast y on line
function f(x)
function sigma(x) positive
dx = f dt + sigma dW2
dy = -y/eps dt + 1/sqrt(eps) dW1
`,
		checks: []check{
			{"drift x", "f + 1/2*sigma*diff(sigma, x)"},
			{"diffusion x x", "sigma^2"},
		},
	},
	{
		title:  "Small mass, friction that depends on the place, Einstein relation",
		source: "P. Hanggi, Phys. Rev. A 25 (1982) 1130; P. Hanggi, H. Thomas, Phys. Rep. 88 (1982) 207: the isothermal (anti-Ito) drift D', with D = kT/fric; J.W. Gibbs's density (from memory)",
		model: `
slow x on line
fast p on line
param kT = 0.7 positive
function fric(x) positive
function U(x)
dx = p/eps dt
dp = -diff(U, x)/eps dt - fric*p/eps^2 dt + sqrt(2*kT*fric)/eps dW1
`,
		checks: []check{
			{"drift x", "-diff(U, x)/fric + diff(kT/fric, x)"},
			{"diffusion x x", "2*(kT/fric)"},
			{"density", "exp(-U/kT)"},
			{"mean p^2", "kT"},
		},
	},
	{
		title:  "Small mass without the Einstein relation",
		source: "S. Hottovy, G. Volpe, J. Wehr, J. Stat. Phys. 146 (2012) 762: dX = (F/g - g'*s^2/(2*g^3)) dt + s/g dW (from memory); J.M. Sancho, M. San Miguel, D. Duerr, J. Stat. Phys. 28 (1982) 291",
		model: `
slow x on line
fast p on line
function g(x) positive
function s(x) positive
function F(x)
dx = p/eps dt
dp = F/eps dt - g*p/eps^2 dt + s/eps dW1
`,
		checks: []check{
			{"drift x", "F/g - diff(g, x)*s^2/(2*g^3)"},
			{"diffusion x x", "(s/g)^2"},
		},
	},
	{
		title:  "Small mass in a temperature gradient",
		source: "N.G. van Kampen, IBM J. Res. Dev. 32 (1988) 107: current -(1/fric)*(U' p + (kT p)'), density exp(-int U'/kT)/kT (from memory)",
		model: `
slow x on line
fast p on line
function fric(x) positive
function kT(x) positive
dx = p/eps dt
dp = -fric*p/eps^2 dt + sqrt(2*kT*fric)/eps dW1
`,
		checks: []check{
			{"drift x", "kT*diff(1/fric, x)"},
			{"diffusion x x", "2*kT/fric"},
			{"density", "1/kT"},
		},
	},
	{
		title:  "Diffusion across a magnetic field",
		source: "J.B. Taylor, Phys. Rev. Lett. 6 (1961) 262; B. Kursunoglu, Ann. Phys. 17 (1962) 259: D_perp = (kT/g)*g^2/(g^2 + B^2) (from memory)",
		model: `
slow x on line
slow y on line
fast p on line
fast q on line
param kT = 0.7 positive
param g = 1.1 positive
param B = 2
dx = p/eps dt
dy = q/eps dt
dp = (-g*p + B*q)/eps^2 dt + sqrt(2*g*kT)/eps dW1
dq = (-g*q - B*p)/eps^2 dt + sqrt(2*g*kT)/eps dW2
`,
		checks: []check{
			{"diffusion x x", "2*(kT/g)*g^2/(g^2 + B^2)"},
			{"diffusion x y", "0"},
			{"drift x", "0"},
		},
	},
	{
		title:  "Levy area",
		source: "G.A. Pavliotis, A.M. Stuart, Multiscale Methods (2008), section 11.7: the drift alpha/(1 + alpha^2) of the third variable (from memory)",
		model: `
slow x1 on line
slow x2 on line
slow x3 on line
fast y1 on line
fast y2 on line
param alpha = 0.8
dx1 = y1/eps dt
dx2 = y2/eps dt
dx3 = (x1*y2 - x2*y1)/eps dt
dy1 = (-y1 - alpha*y2)/eps^2 dt + 1/eps dW1
dy2 = (-y2 + alpha*y1)/eps^2 dt + 1/eps dW2
`,
		checks: []check{
			{"drift x1", "0"},
			{"drift x3", "alpha/(1 + alpha^2)"},
			{"diffusion x1 x1", "1/(1 + alpha^2)"},
			{"diffusion x1 x2", "0"},
			{"diffusion x3 x3", "(x1^2 + x2^2)/(1 + alpha^2)"},
		},
	},
	{
		title:  "Dispersion in plane Couette flow",
		source: "R. Aris, Proc. R. Soc. A 235 (1956) 67; H. Brenner, D.A. Edwards, Macrotransport Processes (1993): D_eff = kappa*(1 + Pe^2/30), Pe = (U/2)*h/kappa, U the speed of the moving plate (from memory)",
		model:  slit + "dx = U*(y/h - 1/2)/eps dt + sqrt(2*kappa) dW1\n",
		checks: []check{
			{"diffusion x x", "2*(kappa*(1 + (U*h/(2*kappa))^2/30))"},
			{"drift x", "0"},
		},
	},
	{
		title:  "Dispersion in plane Poiseuille flow",
		source: "G.I. Taylor 1953, R. Aris 1956 (as above); O. Levenspiel, Chemical Reaction Engineering: D_eff = kappa*(1 + Pe^2/210), Pe = U*h/kappa, U the mean speed, h the full gap (from memory)",
		model:  slit + "dx = U*(6*(y/h)*(1 - y/h) - 1)/eps dt + sqrt(2*kappa) dW1\n",
		checks: []check{{"diffusion x x", "2*(kappa*(1 + (U*h/kappa)^2/210))"}},
	},
	{
		title:  "Dispersion in a film with a free surface",
		source: "half of the plane Poiseuille flow: D_eff = kappa*(1 + 2*Pe^2/105), Pe = U*h/kappa, U the mean speed, h the depth; R. Aris 1956; H. Brenner, D.A. Edwards 1993 (from memory)",
		model:  slit + "dx = U*(3/2*(1 - (y/h)^2) - 1)/eps dt + sqrt(2*kappa) dW1\n",
		checks: []check{{"diffusion x x", "2*(kappa*(1 + 2*(U*h/kappa)^2/105))"}},
	},
	{
		title:  "Dispersion in a pipe",
		source: "G.I. Taylor, Proc. R. Soc. A 219 (1953) 186: D_eff = R^2*U^2/(48*kappa), U the mean speed; R. Aris 1956 adds kappa",
		model: `
slow x on line
fast r in [0, R] reflecting
param R = 1 positive
param U = 2
param kappa = 0.5 positive
dx = U*(1 - 2*(r/R)^2)/eps dt + sqrt(2*kappa) dW1
dr = kappa/r/eps^2 dt + sqrt(2*kappa)/eps dW2
`,
		checks: []check{
			{"diffusion x x", "2*(kappa + R^2*U^2/(48*kappa))"},
			{"invariant", "r"},
			{"mean r^2", "R^2/2"},
		},
	},
	{
		title:  "Steady periodic shear flow",
		source: "G.A. Pavliotis, A.M. Stuart, Multiscale Methods (2008), section 13.6; A.J. Majda, P.R. Kramer, Phys. Rep. 314 (1999) 237: D_eff = kappa*(1 + Pe^2/2) for the profile U*sin(y), Pe = U/kappa (from memory)",
		model: `
slow x on line
fast y in [0, 2*pi] periodic
param U = 2
param kappa = 0.5 positive
dx = U*sin(y)/eps dt + sqrt(2*kappa) dW1
dy = sqrt(2*kappa)/eps dW2
`,
		checks: []check{{"diffusion x x", "2*(kappa*(1 + (U/kappa)^2/2))"}},
	},
	{
		title:  "Diffusion of a rod in the plane",
		source: "Y. Han et al., Science 314 (2006) 626: long-time diffusivity (Da + Db)/2 (from memory)",
		model: `
slow x on line
slow y on line
fast theta on circle
param Da = 1.3 positive
param Db = 0.4 positive
param D = 0.8 positive
dx = sqrt(2*Da)*cos(theta) dW2 - sqrt(2*Db)*sin(theta) dW3
dy = sqrt(2*Da)*sin(theta) dW2 + sqrt(2*Db)*cos(theta) dW3
dtheta = sqrt(2*D)/eps dW1
`,
		checks: []check{
			{"diffusion x x", "2*((Da + Db)/2)"},
			{"diffusion x y", "0"},
		},
	},
	{
		title:  "Diffusion of a rod in space",
		source: "F. Perrin, J. Phys. Radium 5 (1934) 497: (Da + 2*Db)/3 (from memory)",
		model: `
slow x on line
slow y on line
param Da = 1.3 positive
param Db = 0.4 positive
let s = sqrt(2*Da) - sqrt(2*Db)
let t = sqrt(2*Db)
dx = (t + s*a*a) dW1 + s*a*b dW2 + s*a*c dW3
dy = s*b*a dW1 + (t + s*b*b) dW2 + s*b*c dW3
` + spherical,
		checks: []check{
			{"diffusion x x", "2*((Da + 2*Db)/3)"},
			{"diffusion x y", "0"},
		},
	},
	{
		title:  "Averaging of a skew product",
		source: "G.A. Pavliotis, A.M. Stuart, Multiscale Methods (2008), ch. 10: dX/dt = (1 - lambda/alpha)*X (from memory)",
		model: `
slow x on line
fast y on line
param alpha = 1.5 positive
param lambda = 0.6 positive
dx = (1 - y^2)*x dt
dy = -alpha*y/eps dt + sqrt(2*lambda/eps) dW1
`,
		checks: []check{
			{"drift x", "(1 - lambda/alpha)*x"},
			{"diffusion x x", "0"},
		},
	},
	{
		title:  "Gamma law",
		source: "moments shape*(shape + 1)*...*scale^n of the Gamma law: NIST Digital Library of Mathematical Functions 5.9.1 with 5.5.1; the law of the square-root process: J.C. Cox, J.E. Ingersoll, S.A. Ross, Econometrica 53 (1985) 385 (from memory)",
		model:  supply,
		checks: []check{
			{"mean y", "shape*scale"},
			{"mean y^2", "shape*(shape + 1)*scale^2"},
			{"mean y^3", "shape*(shape + 1)*(shape + 2)*scale^3"},
			{"mean y^4", "shape*(shape + 1)*(shape + 2)*(shape + 3)*scale^4"},
			{"invariant", "y^(shape - 1)*exp(-y/scale)"},
		},
	},
	{
		title:  "Beta law",
		source: "moments p*(p + 1).../((p + q)*(p + q + 1)...) of the Beta law: NIST Digital Library of Mathematical Functions 5.12.1; the law of the Jacobi process: S. Karlin, H.M. Taylor, A Second Course in Stochastic Processes (1981), section 15.6 (from memory)",
		model:  fraction,
		checks: []check{
			{"mean y", "p/(p + q)"},
			{"mean y^2", "p*(p + 1)/((p + q)*(p + q + 1))"},
			{"mean y^3", "p*(p + 1)*(p + 2)/((p + q)*(p + q + 1)*(p + q + 2))"},
			{"mean y*(1 - y)", "p*q/((p + q)*(p + q + 1))"},
			{"invariant", "y^(p - 1)*(1 - y)^(q - 1)"},
		},
	},
	{
		title:  "Normal law in two dimensions",
		source: "L. Isserlis, Biometrika 12 (1918) 134: fourth moments from second ones; the covariance of dz = -K z dt + S dW from the Lyapunov equation: C. Gardiner, Stochastic Methods (2009), section 4.5.6 (from memory)",
		model: `
slow x on line
fast u on line
fast w on line
param a = 1 positive
param b = 2 positive
param k = 0.6 positive
param s = 0.8 positive
dx = -x dt
du = (-a*u + k*w)/eps dt
dw = -b*w/eps dt + s/sqrt(eps) dW1
let ww = s^2/(2*b)
let uw = k*ww/(a + b)
let uu = k*uw/a
`,
		checks: []check{
			{"mean w^2", "ww"},
			{"mean u*w", "uw"},
			{"mean u^2", "uu"},
			{"mean u^2*w^2", "uu*ww + 2*uw^2"},
			{"mean u^4", "3*uu^2"},
			{"mean u^3*w", "3*uu*uw"},
			{"mean w^6", "15*ww^3"},
		},
	},
	{
		title:  "Uniform law on the sphere",
		source: "isotropic tensors: <a^2> = 1/3, <a^4> = 1/5, <a^2 b^2> = 1/15, <a^2 b^2 c^2> = 1/105; H. Brenner, D.A. Edwards, Macrotransport Processes (1993) (from memory; common knowledge)",
		model:  "slow x on line\ndx = -x dt\n" + spherical,
		checks: []check{
			{"mean a^2", "1/3"},
			{"mean a^4", "1/5"},
			{"mean a^2*b^2", "1/15"},
			{"mean a^2*b^2*c^2", "1/105"},
			{"mean a*b", "0"},
		},
	},
	{
		title:  "Student law",
		source: "J.L. Forman, M. Sorensen, Scand. J. Stat. 35 (2008) 438: Pearson diffusion with the variance of a scaled Student law, nu/(nu - 2) for unit scale (from memory)",
		model: `
slow x on line
fast y on line
param nu = 7 positive
dx = -x dt
dy = -(nu - 1)*y/2/eps dt + sqrt((nu + y^2)/eps) dW1
`,
		checks: []check{
			{"mean y^2", "nu/(nu - 2)"},
			{"invariant", "(1 + y^2/nu)^(-(nu + 1)/2)"},
		},
	},
	{
		title:  "Periodic potential",
		source: "S. Lifson, J.L. Jackson, J. Chem. Phys. 36 (1962) 2410; R. Festa, E. Galleani d'Agliano, Physica A 90 (1978) 229: D_eff = D/(<exp(V/D)> <exp(-V/D)>), for a cosine D/I0(V0/D)^2 (from memory)",
		model: `
slow x on line
fast y in [0, 2*pi] periodic
param V0 = 0.7
param D = 0.5 positive
dx = V0*sin(y)/eps dt + sqrt(2*D) dW1
dy = V0*sin(y)/eps^2 dt + sqrt(2*D)/eps dW1
`,
		checks: []check{
			{"diffusion x x", "2*(D/besseli(0, V0/D)^2)"},
			{"invariant", "exp(-V0*cos(y)/D)"},
		},
	},
	{
		title:  "Heading in an aligning field",
		source: "R. von Mises's law: <cos theta> = I1(k/D)/I0(k/D): K.V. Mardia, P.E. Jupp, Directional Statistics (2000), section 3.5.4 (from memory)",
		model: `
slow x on line
fast theta on circle
param k = 1.1 positive
param D = 0.8 positive
dx = cos(theta) dt
dtheta = -k*sin(theta)/eps dt + sqrt(2*D/eps) dW1
`,
		checks: []check{
			{"drift x", "besseli(1, k/D)/besseli(0, k/D)"},
			{"invariant", "exp(k*cos(theta)/D)"},
		},
	},
	{
		title:  "Direction in a field in space",
		source: "P. Langevin, Ann. Chim. Phys. 5 (1905) 70: <c> = coth(k/D) - D/k (from memory)",
		model: `
slow x on line
fast (a, b, c) on sphere
param k = 1.1 positive
param D = 0.8 positive
dx = c dt
da = (-k*a*c - 2*D*a)/eps^2 dt + sqrt(2*D)/eps*(b dW13 - c dW12)
db = (-k*b*c - 2*D*b)/eps^2 dt + sqrt(2*D)/eps*(c dW11 - a dW13)
dc = (k*(1 - c^2) - 2*D*c)/eps^2 dt + sqrt(2*D)/eps*(a dW12 - b dW11)
`,
		checks: []check{{"drift x", "cosh(k/D)/sinh(k/D) - D/k"}},
	},
}
