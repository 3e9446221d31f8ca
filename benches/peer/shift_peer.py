# Origin: reference/bench/shift_peer.py of the reference material the project was given; unchanged but for this line. Run by benches/engine.rs.
"""What a practitioner would write: enrichment and capped mean distance of conductors against contacts,
(a) numpy: K sampled shifts, overlap slices, python loop;  (b) scipy.fft: every shift at once.
usage: shift_peer.py N depths mode   (mode: loop|fft)"""
import sys,time,resource,numpy as np
from scipy import fft as sf, ndimage as nd
N,nd_,mode=int(sys.argv[1]),int(sys.argv[2]),sys.argv[3]
rng=np.random.default_rng(1)
def field(L):
    f=np.fft.rfftfreq(2*N);g=np.fft.fftfreq(2*N);k=np.hypot(*np.meshgrid(f,g))
    z=rng.standard_normal((2*N,2*N));a=np.fft.irfft2(np.fft.rfft2(z)*(1+(2*np.pi*k*L)**2)**-1.5,s=(2*N,2*N))[:N,:N]
    return (a-a.mean())/a.std()
W=np.ones((N,N),bool);W[:N//4,N//2:]=False
B=field(20);gy,gx=np.gradient(B);H=np.hypot(gx,gy);E=(H==nd.maximum_filter(H,5))|(H>np.quantile(H,.95));D=np.minimum(nd.distance_transform_edt(~E),8)
R=[1,2,3,4,5];A=[field(8) for _ in range(nd_)];C=[(a>np.quantile(a[W],.8))&W for a in A]
t=time.perf_counter()
if mode=='loop':
    K=999;m=N//4
    for c in C:
        for k in range(K):
            dy,dx=rng.integers(-m,m+1,2)
            ys=slice(max(0,dy),N+min(0,dy));xs=slice(max(0,dx),N+min(0,dx));yt=slice(max(0,-dy),N+min(0,-dy));xt=slice(max(0,-dx),N+min(0,-dx))
            w=W[ys,xs]&W[yt,xt];n=w.sum();cc=c[yt,xt]&W[ys,xs];s=cc.sum();d=D[ys,xs];
            for r in R:
                b=d<=r;h=(cc&b).sum();f=(w&b).sum();e=(h/max(s,1))/(f/n)
            md=d[cc].mean()-d[w].mean()
    done=K
else:
    P=sf.next_fast_len(2*N,real=True);F=lambda x:sf.rfft2(x,(P,P),workers=2);I=lambda X:sf.irfft2(X,(P,P),workers=2)
    Wf=F(W.astype(float));n=I(np.conj(Wf)*Wf);M=[F((W&(D<=r)).astype(float)) for r in R];Df=F(np.where(W,D,0.));refs=[I(np.conj(Wf)*m) for m in M];dm=I(np.conj(Wf)*Df)
    for c in C:
        Cf=np.conj(F(c.astype(float)));s=I(Cf*Wf)
        with np.errstate(all='ignore'):
            for m,f in zip(M,refs): e=(I(Cf*m)/s)/(f/n)
            md=I(Cf*Df)/s-dm/n
    done=(2*(N//4)+1)**2
el=time.perf_counter()-t
print(f"{mode} N={N} depths={nd_} shifts={done} s={el:.3f} us_per_shift_depth={el/done/nd_*1e6:.2f} maxrss_MB={resource.getrusage(resource.RUSAGE_SELF).ru_maxrss/1024:.0f}")
