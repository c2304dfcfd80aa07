"""Dormand and Prince's method of order 8(5,3), compiled by numba: the source is written out for 6 or for 42 equations.

Coefficients are scipy's, step control is that of Hairer, Norsett and Wanner, *Solving Ordinary Differential Equations I*,
section II.10; no dense output. The 42 equations of a matrix are all in the error control.
"""

import functools
import math

import numba
import numpy as np
from scipy.integrate._ivp import dop853_coefficients  # a private module: versions are pinned

from .problem import Job

numba.set_num_threads(1)


def source(n):
    """Unrolled for n = 6, with 42-long loops over one flat array for n = 42. Coefficients are literals, zeros skipped."""
    dc = dop853_coefficients
    A = dc.A[:12, :12]
    B, E3, E5 = dc.B, dc.E3[:12], dc.E5[:12]
    L = ["def prop(mu, om, s, tend, rtol, atol, K, W, out):"]
    R = L.append
    I = range(n)

    def comb(co, name):
        t = ["%r*%s" % (float(c), name(k)) for k, c in enumerate(co) if c != 0.0]
        return "+".join(t) or "0.0"

    def rhs(ind, pos, kname):
        x, y, z, u, v, w = (pos(i) for i in range(6))
        for line in ("e1=%s+mu" % x, "e2=%s-om" % x, "yz=%s*%s+%s*%s" % (y, y, z, z),
                     "q1=e1*e1+yz", "q2=e2*e2+yz",
                     "a=om/(q1*sqrt(q1))", "b=mu/(q2*sqrt(q2))", "c=1.0-a-b",
                     "%s=%s" % (kname(0), u), "%s=%s" % (kname(1), v), "%s=%s" % (kname(2), w),
                     "%s=2.0*%s+%s-a*e1-b*e2" % (kname(3), v, x), "%s=c*%s-2.0*%s" % (kname(4), y, u),
                     "%s=-(a+b)*%s" % (kname(5), z)):
            R(ind + line)
        if n == 42:                                       # Phi row-major from 6 on
            for line in ("a5=3.0*a/q1", "b5=3.0*b/q2", "ab=a5+b5", "g=a5*e1+b5*e2",
                         "uxx=c+a5*e1*e1+b5*e2*e2", "uyy=c+ab*%s*%s" % (y, y), "uzz=c-1.0+ab*%s*%s" % (z, z),
                         "uxy=g*%s" % y, "uxz=g*%s" % z, "uyz=ab*%s*%s" % (y, z),
                         "for j in range(18): %s=%s" % (kname("6+j"), pos("24+j")),
                         "for j in range(6):"):
                R(ind + line)
            p = [pos("%d+j" % (6 + 6 * r)) for r in range(6)]
            R(ind + " %s=uxx*%s+uxy*%s+uxz*%s+2.0*%s" % (kname("24+j"), p[0], p[1], p[2], p[4]))
            R(ind + " %s=uxy*%s+uyy*%s+uyz*%s-2.0*%s" % (kname("30+j"), p[0], p[1], p[2], p[3]))
            R(ind + " %s=uxz*%s+uyz*%s+uzz*%s" % (kname("36+j"), p[0], p[1], p[2]))

    if n == 6:
        y = lambda i: "y%s" % i
        yt = lambda i: "q_%s" % i
        k = lambda s: (lambda i: "k%d_%s" % (s, i))

        def each(ind, make):
            for i in I:
                R(ind + make(str(i)))
    else:
        y = lambda i: "W[%s]" % i
        yt = lambda i: "W[42+%s]" % i
        k = lambda s: (lambda i: "K[%d+%s]" % (42 * s, i))

        def each(ind, make):
            R(ind + "for i in range(42):")
            for line in make("i").split(";"):
                R(ind + " " + line)

    t = " "
    each(t, lambda i: "%s=s[%s]" % (y(i), i))
    rhs(t, y, k(0))
    R(" nst=0")
    # first step
    R(" f2=0.0;g2=0.0")
    each(t, lambda i: "sk=atol+rtol*abs(%s);f2+=(%s/sk)**2;g2+=(%s/sk)**2" % (y(i), k(0)(i), y(i)))
    R(" h=1e-6 if (f2<=1e-10 or g2<=1e-10) else sqrt(g2/f2)*0.01")
    R(" h=min(h,tend)")
    each(t, lambda i: "%s=%s+h*%s" % (yt(i), y(i), k(0)(i)))
    rhs(t, yt, k(1))
    R(" d2=0.0")
    each(t, lambda i: "d2+=((%s-%s)/(atol+rtol*abs(%s)))**2" % (k(1)(i), k(0)(i), y(i)))
    R(" d2=sqrt(d2)/h")
    R(" dm=max(d2,sqrt(f2))")
    R(" h1=max(1e-6,h*1e-3) if dm<=1e-15 else (0.01/dm)**0.125")
    R(" h=min(100.0*h,min(h1,tend))")
    R(" now=0.0;rejected=False;last=False")
    R(" while True:")
    t = "  "
    R(t + "if now+1.01*h>=tend:")
    R(t + " h=tend-now;last=True")
    for s in range(1, 12):
        each(t, lambda i: "%s=%s+h*(%s)" % (yt(i), y(i), comb(A[s, :s], lambda q: k(q)(i))))
        rhs(t, yt, k(s))
    each(t, lambda i: "%s=%s+h*(%s)" % (yt(i), y(i), comb(B, lambda q: k(q)(i))))
    R(t + "e5=0.0;e3=0.0")
    each(t, lambda i: ("isk=1.0/(atol+rtol*max(abs(%s),abs(%s)));p5=(%s)*isk;p3=(%s)*isk;e5+=p5*p5;e3+=p3*p3"
                       % (y(i), yt(i), comb(E5, lambda q: k(q)(i)), comb(E3, lambda q: k(q)(i)))))
    R(t + "dn=e5+0.01*e3")
    R(t + "err=0.0 if dn<=0.0 else h*e5/sqrt(dn*%d.0)" % n)
    R(t + "f=sqrt(sqrt(sqrt(err)))/0.9")                  # err**(1/8)/safety
    R(t + "nst+=1")
    R(t + "if err<=1.0:")
    t = "   "
    R(t + "now+=h;f=max(f,1.0/6.0)")
    R(t + "if rejected: f=max(f,1.0)")
    R(t + "rejected=False")
    each(t, lambda i: "%s=%s" % (y(i), yt(i)))
    R(t + "if last: break")
    rhs(t, y, k(0))
    R(t + "h/=f")
    R("  else:")
    R("   h/=min(f,3.0);rejected=True;last=False")
    t = " "
    each(t, lambda i: "out[%s]=%s" % (i, y(i)))
    R(" return nst")
    return "\n".join(L) + "\n"


@functools.cache
def compiled(n):
    space = {"sqrt": math.sqrt}
    exec(compile(source(n), f"dop853_{n}", "exec"), space)
    # For sums over 42 entries 'reassoc' is what lets LLVM vectorise; n = 6 gets fused multiply-adds only.
    fastmath = {"contract", "reassoc"} if n == 42 else {"contract"}
    prop = numba.njit(fastmath=fastmath, boundscheck=False)(space["prop"])

    @numba.njit
    def many(times, mu, om, s, tend, rtol, atol, K, W, out):
        for _ in range(times):
            for m in range(s.shape[0]):
                prop(mu, om, s[m], tend, rtol, atol, K, W, out[m])

    return many


def make(case, tolerance):
    n = 42 if case.matrix else 6
    many = compiled(n)
    initial = case.states
    if case.matrix:
        initial = np.concatenate([initial[0], np.eye(6).ravel()])[None, :].copy()
    stages, work, final = np.zeros(12 * n), np.zeros(2 * n), np.zeros_like(initial)

    def run(times):
        many(times, case.mu, 1.0 - case.mu, initial, case.t, tolerance, tolerance, stages, work, final)

    return Job(run, lambda: (final[:, :6], final[0, 6:].reshape(6, 6) if case.matrix else None))


PEERS = {
    f"numba DOP853 {name}": (("single", "ensemble", "matrix"), lambda case, t=float(name): make(case, t))
    for name in ("1e-13", "1e-15")
}
