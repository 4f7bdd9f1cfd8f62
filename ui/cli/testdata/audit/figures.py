#!/usr/bin/env python3
# Recomputes what `design --json` prints from the plant file alone, with NumPy and SciPy 1.10,
# and stores the figures that ui/cli/audit_test.go holds the program to. Only the gain is the program's.
# Usage: POLEWRIGHT=path/to/polewright python3 figures.py   (in this folder)
import os
for k in ('OMP_NUM_THREADS','OPENBLAS_NUM_THREADS','MKL_NUM_THREADS'): os.environ[k]='1'
import sys, json, tomllib, subprocess, itertools, math, cmath
import numpy as np, scipy.linalg as sl
from scipy.optimize import linear_sum_assignment
PW=os.environ.get('POLEWRIGHT','polewright')
import mpmath as mp
def ev(x, par):
    if isinstance(x,str): return float(eval(x.replace('^','**'),{'__builtins__':{}, **{k:getattr(math,k) for k in ('pi','sqrt','sin','cos','exp')}},par))
    return float(x)
def mat(rows, par, r, c):
    if rows is None: return np.zeros((r,c))
    M=np.array([[ev(x,par) for x in row] for row in rows],float).reshape(r,c)
    return M
def build(path, period=None, factors=None, unknowns=True, sensors_use=None, surprise=False):
    t=tomllib.load(open(path,'rb')) if path.endswith('.toml') else json.load(open(path))
    par={k:(v['value'] if isinstance(v,dict) else v)*( (factors or {}).get(k,1)) for k,v in t.get('parameters',{}).items()}
    mo=t['model']; n=len(mo['A']); A=mat(mo['A'],par,n,n)
    B=mo.get('B'); m=len(B[0]) if B else 0; B=mat(B,par,n,m)
    p=len(mo['C']); C=mat(mo['C'],par,p,n); D=mat(mo.get('D'),par,p,m)
    G=mat(mo['G'],par,n,len(mo['G'][0])) if 'G' in mo else np.eye(n); q=G.shape[1]
    fileperiod=mo.get('period_s',0) or 0
    cont=mo['time']=='continuous'
    T=fileperiod if period is None else period
    st=t.get('states') or [{} for _ in range(n)]; st=[{'name':f'x{i+1}','scale':1.0,**s} for i,s in enumerate(st)]
    inp=t.get('inputs') or [{} for _ in range(m)]; inp=[{'name':f'u{i+1}','scale':1.0,**s} for i,s in enumerate(inp)]
    sen=t.get('sensors') or [{} for _ in range(p)]; sen=[{'name':f'y{i+1}','scale':1.0,**s} for i,s in enumerate(sen)]
    used=[i for i in range(p) if sen[i].get('enabled',True)]
    if sensors_use is not None: used=sensors_use
    # process noise
    pn=t.get('process_noise',{})
    if 'covariance' in pn: Q=np.array(pn['covariance'],float)
    elif 'density' in pn: Q=np.diag(np.array(pn['density'],float))
    elif 'std' in pn: Q=np.diag(np.array(pn['std'],float)**2)
    else: Q=np.zeros((q,q))
    # sensor noise
    sn=t.get('sensor_noise',{})
    disc = (not cont) or T>0
    if 'covariance' in sn: 
        R=np.array(sn['covariance'],float)
        if cont and not disc and fileperiod>0: R=R*fileperiod
    else:
        R=np.zeros((p,p))
        for i,s in enumerate(sen):
            v=0.
            if 'noise_density' in s:
                if disc: v=s['noise_density']/T
                else: v=s['noise_density']
            elif 'noise_std' in s:
                v=s['noise_std']**2
                if not disc: v*=fileperiod
            r=s.get('resolution',0)
            if r and not s.get('noise_includes_resolution',False):
                if disc: v+=r*r/12
                elif fileperiod>0: v+=r*r/12*fileperiod
            R[i,i]=v
    R=R[np.ix_(used,used)]
    # continuous/discrete augmentation on names list in final order: plant, input lags, sensor lags, [delays], unknowns
    names=[s['name'] for s in st]; scale=[s['scale'] for s in st]; role=['plant']*n
    il={j:n+k for k,j in enumerate([j for j in range(m) if inp[j].get('lag_s',0)>0])}
    for j in il: names.append(inp[j]['name']+' lag'); scale.append(inp[j]['scale']); role.append('lag')
    sll={}
    for i in used:
        if sen[i].get('lag_s',0)>0: sll[i]=len(names); names.append(sen[i]['name']+' lag'); scale.append(sen[i]['scale']); role.append('lag')
    nl=len(names)
    unk=[]
    if unknowns:
        for u in t.get('unknowns',[]):
            u={'scale':1.0,**u}
            isen=u['kind']=='sensor-offset'
            idx=[s['name'] for s in (sen if isen else inp)].index(u['on'])
            if isen and idx not in used: continue
            k=len(names)
            cnt=2 if u['kind'] in('input-ramp','input-sine') else 1
            for _ in range(cnt): names.append('unk'); scale.append(u['scale']); role.append('unknown')
            unk.append((u['kind'],idx,k,u))
    N=len(names)
    lagk=lambda tau: (math.exp(-T/tau),-math.expm1(-T/tau)) if not cont else (-1/tau,1/tau)
    Aa=np.zeros((N,N)); Ba=np.zeros((N,m)); Ca=np.zeros((len(used),N)); Da=np.zeros((len(used),m))
    Ux=np.zeros((m,N)); Uu=np.zeros((m,m))
    for j in range(m):
        if j in il: Ux[j,il[j]]=1
        else: Uu[j,j]=1
    for kind,idx,k,u in unk:
        if kind!='sensor-offset': Ux[idx,k]+=1
    Aa[:n,:n]=A; Aa[:n]+=B@Ux; Ba[:n]=B@Uu
    Sx=np.zeros((p,N)); Sx[:,:n]=C; Sx+=D@Ux; Su=D@Uu
    for j,k in il.items():
        a,b=lagk(inp[j]['lag_s']); Aa[k,k]=a; Ba[k,j]=b
    for r,i in enumerate(used):
        if i in sll:
            a,b=lagk(sen[i]['lag_s']); k=sll[i]
            Aa[k]+=b*Sx[i]; Aa[k,k]+=a; Ba[k]+=b*Su[i]; Ca[r,k]=1
        else: Ca[r]=Sx[i]; Da[r]=Su[i]
    # surprise entry (bypasses input lag & delay)
    Bs=np.zeros((N,m)); Ds=np.zeros((len(used),m)); Bs[:n]=B
    for r,i in enumerate(used):
        if i in sll:
            a,b=lagk(sen[i]['lag_s']); Bs[sll[i]]+=b*D[i]
        else: Ds[r]=D[i]
    Gc=[np.vstack([G,np.zeros((N-n,q))])]; Qs=[Q]
    for kind,idx,k,u in unk:
        d=u['drift']*(1 if cont else T)
        if kind=='sensor-offset':
            r=used.index(idx); Ca[r,k]+=1
        if kind in('sensor-offset','input-offset'):
            if not cont: Aa[k,k]=1
            e=np.zeros((N,1)); e[k]=1; Gc.append(e); Qs.append([[d]])
        if kind=='input-ramp':
            if cont: Aa[k,k+1]=1
            else: Aa[k,k]=Aa[k+1,k+1]=1; Aa[k,k+1]=T
            e=np.zeros((N,1)); e[k+1]=1; Gc.append(e); Qs.append([[d]])
        if kind=='input-sine':
            w=2*math.pi*u['frequency_hz']
            blk=np.array([[0,w],[-w,0]]) if cont else np.array([[math.cos(w*T),math.sin(w*T)],[-math.sin(w*T),math.cos(w*T)]])
            Aa[k:k+2,k:k+2]=blk
            e=np.zeros((N,2)); e[k,0]=e[k+1,1]=1; Gc.append(e); Qs.append(np.eye(2)*d)
    Ga=np.hstack(Gc); Qa=sl.block_diag(*Qs)
    Bsd=Bs
    Qfull=Ga@Qa@Ga.T
    if cont and disc:
        # high precision sampling
        mp.mp.dps=40
        def expm(M):
            return np.array(mp.expm(mp.matrix(M.tolist()),method='taylor').tolist(),dtype=object)
        BB=np.hstack([Ba,Bs])
        M=np.zeros((N+2*m,N+2*m)); M[:N,:N]=Aa; M[:N,N:]=BB
        E=sl.expm(M*T)
        Ad=E[:N,:N]; Bd=E[:N,N:N+m]; Bsd=E[:N,N+m:]
        nrm=np.linalg.norm(Aa*T,1); k=max(0,int(math.ceil(math.log2(max(nrm,1e-300))))+2); h=T/2**k
        V=np.zeros((2*N,2*N)); V[:N,:N]=-Aa; V[:N,N:]=Qfull; V[N:,N:]=Aa.T
        E=sl.expm(V*h); Phi=E[N:,N:].T; Qd=Phi@E[:N,N:]
        for _ in range(k): Qd=Qd+Phi@Qd@Phi.T; Phi=Phi@Phi
        Qfull=(Qd+Qd.T)/2; Aa,Ba=Ad,Bd
        Ga=np.eye(N); Qa=Qfull
    # delays
    nd=0; dl=[]
    if disc:
        for j in range(m):
            d=inp[j].get('delay_samples',0)
            if d: dl.append(('i',j,d))
        for r,i in enumerate(used):
            d=sen[i].get('delay_samples',0)
            if d: dl.append(('s',r,d))
    nd=sum(d for *_,d in dl)
    opv=list((t.get('operating_point',{}).get('states') or [0]*n))
    opi=list((t.get('operating_point',{}).get('inputs') or [0]*m)); ops=list((t.get('operating_point',{}).get('sensors') or [0]*p))
    estop=opv+[opi[j] for j in il]+[ops[i] for i in sll]
    if nd:
        M=N+nd
        A2=np.zeros((M,M)); B2=np.zeros((M,m)); C2=np.zeros((len(used),M)); D2=Da.copy()
        A2[:N,:N]=Aa; B2[:N]=Ba; C2[:,:N]=Ca
        Bs2=np.zeros((M,m)); Bs2[:N]=Bsd; Ds2=Ds.copy()
        k=N; nm=[];sc=[]; dop=[]
        for typ,j,d in dl:
            head=k; last=k+d-1
            for x in range(head+1,last+1): A2[x,x-1]=1
            if typ=='i':
                A2[:N,last]=B2[:N,j]; B2[:N,j]=0; C2[:,last]+=D2[:,j]; D2[:,j]=0; B2[head,j]=1
                nm+= [f"{inp[j]['name']} delay {x+1}" for x in range(d)]; sc+=[inp[j]['scale']]*d; dop+=[opi[j]]*d
            else:
                A2[head,:]+=C2[j,:]; C2[j,:]=0; B2[head]=D2[j]; D2[j]=0; Bs2[head]=Ds2[j]; Ds2[j]=0; C2[j,last]=1
                s=sen[used[j]]; nm+= [f"{s['name']} delay {x+1}" for x in range(d)]; sc+=[s['scale']]*d; dop+=[ops[used[j]]]*d
            k+=d
        order=list(range(nl))+list(range(N,M))+list(range(nl,N))
        P=np.array(order)
        Aa=A2[np.ix_(P,P)]; Ba=B2[P]; Ca=C2[:,P]; Da=D2; Bsd=Bs2[P]; Ds=Ds2
        Ga=np.vstack([Ga,np.zeros((nd,Ga.shape[1]))])[P]
        Qfull=sl.block_diag(Qfull,np.zeros((nd,nd)))[np.ix_(P,P)]
        if cont: Ga=np.eye(M); Qa=Qfull
        names=names[:nl]+nm+names[nl:]; scale=scale[:nl]+sc+scale[nl:]; role=role[:nl]+['delay']*nd+role[nl:]
        estop=estop+dop
    N=len(names); estop=estop+[0]*(N-len(estop))
    K=None
    fb=t.get('feedback')
    if fb:
        K0=mat(fb['K'],par,m,n); K=np.zeros((m,N)); K[:,:n]=K0
        ui=[i for i in range(N) if role[i]=='unknown']; 
        base=min(ui) if ui else 0
        k=base
        for kind,idx,_,u in unk:
            if kind=='input-offset' and u['on'] in fb.get('cancel',[]): K[idx,k]=1
            k+=2 if kind in('input-ramp','input-sine') else 1
    return dict(A=Aa,B=Ba,C=Ca,D=Da,G=Ga,Q=Qa,W=Qfull,R=R,names=names,scale=np.array(scale,float),role=role,disc=disc,T=T if disc else 0,
      K=K,used=used,sen=sen,inp=inp,st=st,t=t,Bs=Bsd,Ds=Ds,estop=np.array(estop,float),sscale=np.array([sen[i]['scale'] for i in used],float),n=n,m=m,opi=opi,ops=ops,opv=opv,cont=cont,
      outputs=t.get('outputs',[]))
def cpx(l):
    return np.array([complex(*x) if x is not None else complex(np.nan) for x in l])
def rel(a,b,floor=0):
    a=np.asarray(a); b=np.asarray(b)
    if a.shape!=b.shape: return np.inf
    if a.size==0: return 0
    den=max(np.max(np.abs(b)),floor)
    return float(np.max(np.abs(a-b))/den) if den>0 else float(np.max(np.abs(a)))
def match(a,b):
    c=np.abs(a[:,None]-b[None,:]); i,j=linear_sum_assignment(c); return i,j
class Rep:
    def __init__(s,tag): s.tag=tag; s.ok={}; s.bad=[]; s.want={}
    def cmp(s,key,got,want,tol=1e-7,abs_=0,note=''):
        s.want[key]=want
        if want is None or got is None:
            if (want is None)!=(got is None): s.bad.append(f'{key}: printed {got} want {want} {note}')
            else: s.ok.setdefault(key,0)
            return
        if isinstance(got,list) and any(x is None for x in np.ravel(np.array(got,dtype=object))):
            g=np.array(got,dtype=object).ravel(); w=np.ravel(np.array(want,dtype=object))
            for a,b in zip(g,w):
                bn = b is None or (isinstance(b,float) and math.isnan(b))
                if (a is None)!=bn: s.bad.append(f'{key}: null mismatch {got} vs {want}'); return
            got=[a for a in g if a is not None]; want=[b for b in w if b is not None and not math.isnan(b)]
        w=np.array(want,dtype=float if not np.iscomplexobj(want) else complex)
        if np.any(np.isnan(w)): s.bad.append(f'{key}: printed {str(got)[:150]} want nan somewhere {want} {note}'); return
        g=np.array(got,dtype=w.dtype)
        if g.shape!=w.shape: s.bad.append(f'{key}: shape {g.shape} vs {w.shape}'); return
        e=float(np.max(np.abs(g-w))) if g.size else 0
        r=e/max(np.max(np.abs(w)) if w.size else 0,1e-300) if e>0 else 0
        if r<=tol or e<=abs_: s.ok[key]=max(s.ok.get(key,0),r if e>abs_ else 0)
        else: s.bad.append(f'{key}: rel {r:.2e} abs {e:.2e} printed {str(got)[:160]} want {str(np.array(want).tolist())[:160]} {note}')
def run(args):
    r=subprocess.run([PW]+args,capture_output=True,text=True,timeout=120)
    return r.returncode,r.stdout,r.stderr
def stable(ev_,disc,marg=0): return (np.max(np.abs(ev_))<1-marg) if disc else (np.max(ev_.real)<-marg)
def dlyap(F,W):
    # doubling in scaled, robust form
    X=W.copy(); M=F.copy()
    for _ in range(80):
        X=X+M@X@M.T; M=M@M
        if np.max(np.abs(M))<1e-200: break
    return (X+X.T)/2
def lyap(F,W,disc):
    return dlyap(F,W) if disc else (lambda X:(X+X.T)/2)(sl.solve_continuous_lyapunov(F,-W))
def hinfpeak(F,B,disc,T,extra,row,n=3000):
    ev_=np.linalg.eigvals(F)
    if disc: s=np.log(ev_[np.abs(ev_)>1e-9].astype(complex))/T; wmax=math.pi/T
    else: s=ev_; wmax=None
    sc=np.abs(s); sc=sc[sc>0]
    lo=min(sc.min() if len(sc) else 1,1)*1e-3; hi=(wmax if disc else max(sc.max(),1)*1e3)
    ws=[np.zeros(1),np.geomspace(min(lo,hi*1e-6),hi,n)]
    if disc: ws.append(np.linspace(0,hi,n))
    for x in s:
        if abs(x.imag)>0:
            w0=abs(x.imag); d=abs(x.real)+1e-9*w0; ws.append(np.clip(w0+d*np.linspace(-4,4,400),0,hi))
    w=np.unique(np.concatenate(ws))
    def g(w_):
        z=np.exp(1j*w_*T) if disc else 1j*w_
        H=np.linalg.solve(z[:,None,None]*np.eye(len(F))-F, np.broadcast_to(B.astype(complex),(len(w_),)+B.shape))
        return np.sqrt(np.sum(np.abs(H)**2,axis=2))  # rows x
    val=g(w); best=[]
    for i in range(val.shape[1]):
        k=int(np.argmax(val[:,i])); a=w[max(k-1,0)]; b=w[min(k+1,len(w)-1)]
        for _ in range(6):
            ww=np.linspace(a,b,41); v=g(ww)[:,i]; kk=int(np.argmax(v)); a,b=ww[max(kk-1,0)],ww[min(kk+1,40)]
        best.append((max(v[kk],val[k,i]),ww[kk]))
    return best
def audit(path,args=(),period=None,form='prediction',verbose=True,tag=None,expect=0,gain_tol=1e-6,LQ=None):
    tag=tag or (path.split('/')[-1]+' '+' '.join(args))
    R_=Rep(tag)
    rc,out,err=run(['design',path,*args,'--json'])
    if rc!=expect: R_.bad.append(f'exit {rc}, expected {expect}: {err.strip()}')
    if rc==2 or not out: return R_
    j=json.loads(out)
    if 'model' not in j: return R_
    m=build(path,period)
    disc,T=m['disc'],m['T']; A,B,C,D=m['A'],m['B'],m['C'],m['D']; N=len(A); p=len(C)
    W,R=m['W'],m['R']; S=m['scale']
    for k in ['format','plant','model','poles','gain','gain_current','gain_norm','eigenvector_condition','observability','noise','transient','loop','rounding','sensor_sets','warnings']:
        if k not in j: R_.bad.append(f'missing key {k}')
    if j['plant']['time']!=('discrete' if disc else 'continuous'): R_.bad.append('plant.time')
    if disc and j['plant']['period_s']!=T: R_.bad.append(f"period {j['plant']['period_s']} {T}")
    if not disc and j['plant'].get('period_s') not in (None,0): R_.bad.append(f"period_s {j['plant'].get('period_s')} in continuous")
    for k in 'ABCD': 
        if m['m']==0 and k in 'BD': continue
        R_.cmp('model.'+k,j['model'][k],{'A':A,'B':B,'C':C,'D':D}[k],1e-12)
        # elementwise check where nonzero tiny entries matter
        w={'A':A,'B':B,'C':C,'D':D}[k]; g=np.array(j['model'][k],float)
        if g.shape==w.shape:
            nz=np.abs(w)>1e-280
            if nz.any():
                e=np.max(np.abs(g-w)[nz]/np.abs(w)[nz]); 
                if e>1e-8: R_.bad.append(f'model.{k} elementwise rel {e:.1e}')
    Gq=np.array(j['model']['G'],float) if j['model']['G'] is not None else np.eye(N); Qq=np.array(j['model']['Q'],float).reshape(Gq.shape[1],-1)
    R_.cmp('model.GQG',(Gq@Qq@Gq.T).tolist(),W,1e-11)
    if disc and m['cont'] and not (Gq.shape==(N,N) and np.array_equal(Gq,np.eye(N))): R_.bad.append('G not identity after sampling')
    if not (disc and m['cont']): R_.cmp('model.G',Gq.tolist(),m['G'],1e-13); R_.cmp('model.Q',Qq.tolist(),m['Q'],1e-13)
    R_.cmp('model.R',j['model']['R'],R,1e-13)
    nm=j['model']['state_names']
    for a,b in zip(nm,m['names']):
        if b!='unk' and a!=b: R_.bad.append(f'name {a} vs {b}')
    L=np.array(j['gain'],float).reshape(N,p)
    # judge with model as printed (agreement shown above) 
    F=A-L@C; evF=np.linalg.eigvals(F)
    Sc=np.diag(1/S); Si=np.diag(S)
    Fs=Sc@F@Si; As=Sc@A@Si; Cs=np.diag(1/m['sscale'])@C@Si
    # poles
    eig=cpx(j['poles']['eigenvalues']); i1,j1=match(eig,evF)
    sens=np.max(np.abs(eig[i1]-evF[j1]))
    R_.cmp('poles.eigenvalues',0,0); R_.ok['poles.eigenvalues abs']=sens
    if sens>1e-6*max(1,np.max(np.abs(evF))): R_.bad.append(f'poles.eigenvalues abs diff {sens:.1e}')
    wanted=j['poles']['wanted']
    wn=None
    if wanted is not None:
        pl=j['poles']['plane']
        w=cpx(wanted); 
        w=np.where(np.isnan(w.real),-np.inf if pl=='s' else 0,w)
        if pl=='s' and disc: wz=np.array([0 if np.isinf(x.real) else cmath.exp(x*T) for x in w])
        elif pl=='z' and not disc: wz=w
        else: wz=w
        wn=wz
        c=np.abs(wz[:,None]-eig[None,:])/np.where(np.abs(wz)>0,np.abs(wz),1)[:,None]
        # as paired
        pr=np.array([c[k,k] for k in range(N)])
        ii,jj=linear_sum_assignment(c)
        R_.ok['pairing max vs opt']=0
        we=j['poles']['worst_relative_error']
        # best bottleneck
        opt=c[ii,jj].max()
        if we is not None and abs(we-pr.max())>1e-9+1e-3*pr.max() : R_.bad.append(f'worst_relative_error {we} vs as paired {pr.max()} vs optimal {opt}')
        R_.ok['placement error']=pr.max()
        rch=j['poles']['reached']
        for a,b in zip(rch,eig):
            if pl=='s' and disc:
                if b==0: 
                    if a is not None: R_.bad.append(f'reached z=0 not null: {a}')
                elif a is None: R_.bad.append(f'reached null for z={b}')
                else:
                    sx=cmath.log(b)/T
                    d=abs(complex(*a)-sx); d=min(d,abs(complex(*a)-sx.conjugate()) if abs(abs(sx.imag)-math.pi/T)<1e-9 else d)
                    if d>1e-6*max(abs(sx),1): R_.bad.append(f'reached {a} vs {sx}')
            elif a is None or abs(complex(*a)-b)>1e-12: R_.bad.append(f'reached {a} vs {b}')
    # p=1 gain unique
    O=np.vstack([Cs@np.linalg.matrix_power(As,k) for k in range(N)])
    if p==1 and wn is not None and '--use-gain' not in args:
        # Ackermann-free: mp polynomial; use mp high precision
        mp.mp.dps=120
        Am=mp.matrix(As.tolist()); Cm=mp.matrix(Cs.tolist())
        rows=[Cm]; 
        for k in range(1,N): rows.append(rows[-1]*Am)
        Om=mp.matrix(N,N)
        for a in range(N):
            for b in range(N): Om[a,b]=rows[a][0,b]
        sv=np.linalg.svd(O/np.maximum(np.linalg.norm(O,axis=1,keepdims=True),1e-300),compute_uv=False)
        try:
            if j['observability']['rank']==N:
                X=mp.eye(N)
                for z in wn: X=X*(Am-mp.mpc(z)*mp.eye(N))
                en=mp.matrix(N,1); en[N-1]=1
                l=X*mp.lu_solve(Om,en)
                Lw=np.array([float(mp.re(l[a])) for a in range(N)])*S/m['sscale'][0]
                e=np.max(np.abs(L[:,0]-Lw)/S)/max(np.max(np.abs(Lw)/S),1e-300)
                R_.ok['gain p=1 (scaled)']=e
                if e>gain_tol: R_.bad.append(f'gain p=1 rel {e:.2e} printed {L[:,0]} want {Lw}')
        except ZeroDivisionError: pass
    R_.cmp('gain_norm',j['gain_norm'],np.linalg.norm(L,2),1e-10)
    # gain current
    Lf=None
    if disc:
        gc=j['gain_current']
        rk=np.linalg.matrix_rank(As,tol=1e-12*np.linalg.norm(As,2))
        X=np.linalg.lstsq(As,Sc@L,rcond=1e-12)[0]; res=np.linalg.norm(As@X-Sc@L)/max(np.linalg.norm(Sc@L),1e-300)
        if gc is None:
            if res<1e-10: R_.bad.append(f'gain_current null though residual {res:.1e}')
        else:
            Lf=np.array(gc,float).reshape(N,p); e=np.max(np.abs(Sc@(A@Lf-L)))/max(np.max(np.abs(Sc@L)),1e-300)
            R_.ok['A Lf = L']=e
            if e>1e-9: R_.bad.append(f'A Lf != L, rel {e:.1e} (lstsq residual {res:.1e})')
    elif j['gain_current'] is not None: R_.bad.append('gain_current not null in continuous')
    # eigenvector condition
    w_,V=np.linalg.eig(Fs.T)
    target=wn if wn is not None else eig
    # groups
    grp=[]
    for x in target:
        for g in grp:
            if abs(g[0]-x)<=1e-10*max(1,abs(x)): g.append(x); break
        else: grp.append([x])
    cols=[]; defect=False
    for g in grp:
        x=g[0]; u,s_,vh=np.linalg.svd(Fs.T-x*np.eye(N)); k=len(g)
        if k==1 : cols.append(vh[-1].conj()[:,None]); continue
        if s_[N-k]>1e-6*max(1,s_[0]): defect=True
        cols.append(vh[N-k:].conj().T)
    ec=j['eigenvector_condition']
    if defect:
        if ec is not None: R_.bad.append(f'eigenvector_condition {ec}, want null (defective)')
    else:
        Vm=np.hstack(cols); cw=np.linalg.cond(Vm)
        if ec is None: R_.bad.append(f'eigenvector_condition null, want {cw}')
        else:
            e=abs(ec-cw)/cw; R_.ok['eigenvector_condition']=e
            if e>1e-4 and cw<1e12: R_.bad.append(f'eigenvector_condition {ec} want {cw}')
    # observability
    ob=j['observability']; U=0
    evA=np.linalg.eigvals(A)
    sig=[]
    for mode in ob['modes']:
        lam=complex(*mode['eigenvalue']); s_=np.linalg.svd(np.vstack([As-lam*np.eye(N),Cs]),compute_uv=False)[-1]; sig.append(s_)
        if abs(s_-mode['sigma'])>1e-6*s_+1e-12*np.linalg.norm(As): R_.bad.append(f'obs sigma at {lam}: {mode["sigma"]} want {s_}')
    ma=cpx([x['eigenvalue'] for x in ob['modes']])
    # deduplicated or not?
    if len(ma)!=N: R_.bad.append(f'observability.modes has {len(ma)} entries, n={N}')
    else:
        a_,b_=match(ma,evA); d=np.max(np.abs(ma[a_]-evA[b_]))
        if d>1e-5*max(1,np.max(np.abs(evA))): R_.bad.append(f'modes eigenvalues differ {d:.1e}')
    # rank by svd-based staircase
    def unobs(As,Cs,tol=1e-12):
        a=As.copy(); c=Cs.copy(); rank=0; sc_=max(np.linalg.norm(np.vstack([As,Cs]),2),1e-300)
        while a.shape[0]>0:
            u,s_,vh=np.linalg.svd(c); r=int(np.sum(s_>tol*sc_*1)); 
            if r==0: break
            rank+=r; Tm=vh.conj().T; an=Tm.T@a@Tm; c=an[r:,r:]*0 if r==a.shape[0] else an[:r,r:]; a=an[r:,r:]
            if a.shape[0]==0: break
        return rank,(np.linalg.eigvals(a) if a.size else np.array([]))
    rk,fx=unobs(As,Cs)
    R_.cmp('obs.rank',ob['rank'],rk,0)
    fxp=cpx(ob['fixed'])
    if len(fxp)!=len(fx): R_.bad.append(f'fixed {fxp} vs {fx}')
    elif len(fx): 
        a_,b_=match(fxp,fx); d=np.max(np.abs(fxp[a_]-fx[b_]))
        if d>1e-7*max(1,np.max(np.abs(fx))): R_.bad.append(f'fixed differ {d}')
    ge=ob['gramian_eigenvalues']
    if stable(evA,disc,1e-12):
        Wm=lyap(As.T,Cs.T@Cs,disc); R_.cmp('gramian',ge,np.linalg.eigvalsh(Wm),1e-8)
    elif ge is not None: R_.bad.append(f'gramian should be null: {ge}')
    # noise
    nz=j['noise']; st=stable(evF,disc)
    cur=form=='current'
    def cov(L_,Lf_):
        F_=A-L_@C
        if not disc: return lyap(F_,W+L_@R@L_.T,False)
        P=dlyap(F_,W+L_@R@L_.T)
        if cur:
            I=np.eye(N)-Lf_@C; P=I@P@I.T+Lf_@R@Lf_.T
        return (P+P.T)/2
    sP=lambda P:(Sc@P@Sc)
    if not st:
        for k in ('covariance','std','sensor_to_state','peak_gain','over_floor_rms'):
            v=nz.get(k)
            flat=json.dumps(v)
            if v is not None and any(c in flat for c in '0123456789') : R_.bad.append(f'noise.{k} should be null: {flat[:80]}')
        if j['transient']['settle_s'] is not None: R_.bad.append('settle_s not null though unstable')
        if not j['warnings']: R_.bad.append('no warning with unstable F')
    else:
        P=cov(L,Lf)
        R_.cmp('noise.covariance(scaled)',sP(np.array(nz['covariance'],float)).tolist(),sP(P),1e-6)
        R_.cmp('noise.std',nz['std'],np.sqrt(np.diag(P)),1e-6) 
        sdw=np.sqrt(np.maximum(np.diag(P),0)); g=np.array(nz['std'],float)
        for i in range(N):
            if abs(g[i]-sdw[i])>1e-5*sdw[i]+1e-12*S[i]: R_.bad.append(f'std[{i}] {g[i]} want {sdw[i]}')
    # floor
    Pf=None; why=None
    try:
        Wd=W
        # existence tests
        ok=True
        # detectability
        for lam in evA:
            un=(abs(lam)>=1-1e-9) if disc else lam.real>=-1e-9
            if un and np.linalg.svd(np.vstack([As-lam*np.eye(N),Cs]),compute_uv=False)[-1]<1e-9: ok=False; why='undetectable'
        if not disc and (np.linalg.eigvalsh(R)[0]<=0): ok=False; why='R singular'
        # unreachable on stability limit of (A, GQ^1/2)
        ew,evv=np.linalg.eigh((sP(W)+sP(W).T)/2); Gh=evv*np.sqrt(np.maximum(ew,0))
        for lam in evA:
            on=abs(abs(lam)-1)<1e-9 if disc else abs(lam.real)<1e-9*max(1,abs(lam))
            if on and np.linalg.svd(np.hstack([As-lam*np.eye(N),Gh]),compute_uv=False)[-1]<1e-10*(1+np.linalg.norm(Gh)): ok=False; why='unreachable on limit'
        if ok:
            if disc:
                # iterate Riccati by SDA / brute force in scaled coordinates
                Rs=np.diag(1/m['sscale'])@R@np.diag(1/m['sscale']); Qs=sP(W)
                try:
                    X=sl.solve_discrete_are(As.T,Cs.T,Qs,Rs)
                except Exception as e: X=None
                def step(X):
                    Sg=Cs@X@Cs.T+Rs; Kk=As@X@Cs.T@np.linalg.pinv(Sg,rcond=1e-15); FF=As-Kk@Cs
                    Y=FF@X@FF.T+Kk@Rs@Kk.T+Qs; return (Y+Y.T)/2
                if X is None:
                    X=np.eye(N)*max(np.trace(Qs),1.0)
                    for _ in range(200000):
                        Y=step(X); 
                        if np.max(np.abs(Y-X))<1e-14*np.max(np.abs(Y)): X=Y;break
                        X=Y
                # Newton/Hewer refine
                for _ in range(6):
                    Sg=Cs@X@Cs.T+Rs; Kk=As@X@Cs.T@np.linalg.pinv(Sg,rcond=1e-15); FF=As-Kk@Cs
                    if np.max(np.abs(np.linalg.eigvals(FF)))<1: X=dlyap(FF,Kk@Rs@Kk.T+Qs)
                Sg=Cs@X@Cs.T+Rs
                if np.linalg.eigvalsh(Sg)[0]<=0: ok=False; why='CPC+R singular'
                Lfl=Si@(As@X@Cs.T@np.linalg.pinv(Sg,rcond=1e-15))@np.diag(1/m['sscale'])
                Lff=Si@(X@Cs.T@np.linalg.pinv(Sg,rcond=1e-15))@np.diag(1/m['sscale'])
                Pp=Si@X@Si
                Pf=Pp
                if cur:
                    I=np.eye(N)-Lff@C; Pf=I@Pp@I.T+Lff@R@Lff.T
            else:
                Rs=np.diag(1/m['sscale'])@R@np.diag(1/m['sscale'])
                X=sl.solve_continuous_are(As.T,Cs.T,sP(W),Rs)
                for _ in range(4):
                    Kk=X@Cs.T@np.linalg.inv(Rs); FF=As-Kk@Cs
                    if np.max(np.linalg.eigvals(FF).real)<0: X=lyap(FF,Kk@Rs@Kk.T+sP(W),False)
                Pf=Si@X@Si; Lfl=Pf@C.T@np.linalg.inv(R)
    except Exception as e: R_.bad.append(f'audit floor failed: {e}'); ok=None
    if ok is False:
        if nz['floor_covariance'] is not None: R_.bad.append(f'floor exists though {why}: std {nz["floor_std"]}')
        elif not any('floor' in x or 'best' in x for x in j['warnings']): R_.bad.append(f'no floor warning ({why}): {j["warnings"]}')
        else: R_.ok['no floor: '+why]=0
    elif ok:
        if nz['floor_covariance'] is None: R_.bad.append(f'floor null, scipy has one; warnings {[x for x in j["warnings"]]}')
        else:
            fp=np.linalg.eigvals(A-Lfl@C)
            R_.cmp('floor_covariance(scaled)',sP(np.array(nz['floor_covariance'],float)).tolist(),sP(Pf),1e-6)
            fs=np.sqrt(np.maximum(np.diag(Pf),0)); g=np.array(nz['floor_std'],float)
            for i in range(N):
                if abs(g[i]-fs[i])>1e-5*fs[i]+1e-10*S[i]: R_.bad.append(f'floor_std[{i}] {g[i]} want {fs[i]}')
            R_.cmp('floor_gain(scaled)',(Sc@np.array(nz['floor_gain'],float).reshape(N,p)@np.diag(m['sscale'])).tolist(),Sc@Lfl@np.diag(m['sscale']),1e-5)
            fg=cpx(nz['floor_poles']); a_,b_=match(fg,fp); d=np.max(np.abs(fg[a_]-fp[b_])); R_.ok['floor_poles abs']=d
            if d>3e-3*max(1,np.max(np.abs(fp))) : R_.bad.append(f'floor_poles {d}')
            if st:
                of=[None if g[i]==0 else nz['std'][i]/g[i] for i in range(N)]
                R_.cmp('over_floor',nz['over_floor'],[o if o is not None else float('nan') for o in of],1e-7)
                of2=[sdw[i]/fs[i] if fs[i]>1e-12*S[i] else None for i in range(N)]
                dd=[of[i] for i in range(N) if m['role'][i]!='delay' and of[i] is not None]
                R_.cmp('over_floor_rms',nz['over_floor_rms'],math.sqrt(np.mean(np.square(dd))) if dd else None,1e-8)
                for i in range(N):
                    if (of2[i] is None)!=(nz['over_floor'][i] is None): R_.bad.append(f'over_floor[{i}] {nz["over_floor"][i]} vs {of2[i]} floor {g[i]} / {fs[i]} std {sdw[i]}')
                mo=min([x for x in nz['over_floor'] if x is not None],default=1)
                if mo<1-1e-6: R_.bad.append(f'over_floor below 1: {mo}')
    # outputs
    outs=nz.get('outputs') or []
    if len(outs)!=len(m['outputs']): R_.bad.append('noise.outputs count')
    for o,w in zip(outs,m['outputs']):
        r=np.zeros(N); r[:m['n']]=[ev(x,{k:v['value'] for k,v in m['t'].get('parameters',{}).items()}) for x in w['row']]
        R_.cmp('outputs.std',o['std'],math.sqrt(max(r@P@r,0)) if st else None,1e-6)
        R_.cmp('outputs.floor',o['floor_std'],math.sqrt(max(r@Pf@r,0)) if Pf is not None and ok else None,1e-6)
    if st:
        s2s=np.zeros((N,p))
        for k in range(p):
            s2s[:,k]=np.sqrt(np.maximum(np.diag(lyap(F,np.outer(L[:,k],L[:,k]),disc)),0))
        R_.cmp('sensor_to_state(scaled)',(Sc@np.array(nz['sensor_to_state'],float).reshape(N,p)).tolist(),Sc@s2s,1e-6)
        gp=np.array(nz['sensor_to_state'],float).reshape(N,p)
        for i in range(N):
            for k in range(p):
                if abs(gp[i,k]-s2s[i,k])>1e-5*s2s[i,k]+1e-10*np.max(s2s[i]): R_.bad.append(f'sensor_to_state[{i},{k}] {gp[i,k]} want {s2s[i,k]}')
        pk=hinfpeak(F,L,disc,T,None,None); R_.want['peak_gain']=[v for v,_ in pk]; R_.want['floor_std']=np.sqrt(np.maximum(np.diag(Pf),0)); R_.want['sensor_to_state']=s2s
        for i,x in enumerate(nz['peak_gain']):
            v,w=pk[i]
            if x is None or x['value'] is None: R_.bad.append(f'peak_gain[{i}] null want {v}'); continue
            if abs(x['value']-v)>1e-5*v+1e-12*np.max([q[0] for q in pk])*S[i]/max(S) : R_.bad.append(f'peak_gain[{i}] {x["value"]}@{x["rad_per_s"]} want {v}@{w}')
            else: R_.ok['peak_gain']=max(R_.ok.get('peak_gain',0),abs(x['value']-v)/max(v,1e-300) if v>1e-14 else 0)
            if disc and not (0<=x['rad_per_s']<=math.pi/T*(1+1e-12)): R_.bad.append('peak freq range')
            # value at printed frequency
            z=cmath.exp(1j*x['rad_per_s']*T) if disc else 1j*x['rad_per_s']
            hv=np.linalg.norm(np.linalg.solve(z*np.eye(N)-F,L.astype(complex))[i])
            if v>1e-14 and abs(hv-x['value'])>1e-5*v: R_.bad.append(f'peak_gain[{i}] value at its frequency {hv} vs {x["value"]}')
    # transient
    keep=[i for i in range(N) if m['role'][i]!='delay']
    tr=j['transient']
    if st:
        if disc:
            rho=np.max(np.abs(evF)); M=np.eye(N); nr=[]
            Ft=Sc@((np.eye(N)-Lf@C)@A)@Si if cur and Lf is not None else Fs
            kmax=int(min(400000,(math.log(1e-4)/math.log(rho) if rho>1e-12 else N)*3+5*N+200))
            for k in range(kmax):
                nr.append(np.linalg.norm(M[np.ix_(keep,keep)],2)); M=Ft@M
            nr=np.array(nr); above=np.where(nr>0.02)[0]; se=(above[-1]+1)*T if len(above) else 0.0; pkk=nr.max()
            R_.want['settle_s']=se; R_.want['peak']=pkk
            near=np.min(np.abs(nr-0.02))<1e-9
            if tr['settle_s'] is None or abs(tr['settle_s']-se)>(1e-9*max(se,1) if not near else T*1.001): R_.bad.append(f'settle_s {tr["settle_s"]} want {se} (norm after {nr[min(len(nr)-1,(above[-1]+1) if len(above) else 0)]})')
            else: R_.ok['settle_s']=0
            if abs(tr['peak']-pkk)>1e-6*pkk: R_.bad.append(f'transient.peak {tr["peak"]} want {pkk}')
            else: R_.ok['transient.peak']=max(R_.ok.get('transient.peak',0),abs(tr['peak']-pkk)/pkk)
        else:
            nf=lambda t_:np.linalg.norm(sl.expm(Fs*t_)[np.ix_(keep,keep)],2)
            slow=-np.max(evF.real); fast=np.max(np.abs(evF)); tend=(tr['settle_s'] or 1/slow)*1.6+5/slow
            # multiscale grid
            peak=1; last=0
            for (a,b,cn) in ((0,20/fast,500),(0,tend/8,800),(0,tend,1500)):
                dt=(b-a)/cn; E=sl.expm(Fs*dt); M=np.eye(N); 
                vals=np.empty(cn+1)
                for k in range(cn+1): vals[k]=np.linalg.norm(M[np.ix_(keep,keep)],2); M=M@E
                peak=max(peak,vals.max()); k=np.where(vals>0.02)[0]
                if len(k): last=max(last,k[-1]*dt); ldt=dt
            # refine last
            a=last
            b=last+ldt
            for _ in range(50):
                c=(a+b)/2
                if nf(c)>0.02:a=c
                else:b=c
            if tr['settle_s'] is None or abs(tr['settle_s']-a)>1e-4*a: R_.bad.append(f'settle_s {tr["settle_s"]} want {a}; norm there {nf(tr["settle_s"] or 0)}')
            else: R_.ok['settle_s cont']=abs(tr['settle_s']-a)/max(a,1e-300)
            if abs(tr['peak']-peak)>1e-6*peak:
              ks_=np.linspace(0,20/slow,200); 
              from scipy.optimize import minimize_scalar
              g_=np.unique(np.concatenate([np.geomspace(1e-3/fast,20/slow,600)])); vv=[nf(x) for x in g_]; q_=int(np.argmax(vv)); o_=minimize_scalar(lambda x:-nf(x),bounds=(g_[max(q_-1,0)],g_[min(q_+1,len(g_)-1)]),method='bounded',options={'xatol':1e-12}); peak=max(peak,-o_.fun)
            if tr['peak']<peak*(1-1e-6) or tr['peak']>peak*(1+1e-5): R_.bad.append(f'transient.peak {tr["peak"]} want {peak}')
            else: R_.ok['transient.peak cont']=abs(tr['peak']-peak)/peak
    # loop
    lp=j['loop']
    if m['K'] is None:
        if lp is not None: R_.bad.append('loop not null')
    elif lp is None: R_.bad.append('loop null')
    else: loopcheck(R_,j,m,L,Lf,form,st,P if st else None)
    # rounding
    f32=lambda x: np.float32(x).astype(float)
    F32=f32(A)-f32(L)@f32(C); e32=np.linalg.eigvals(F32)
    c=np.abs(evF[:,None]-e32[None,:]); den=np.where(np.abs(evF)>0,np.abs(evF),1)
    cr=c/den[:,None]; i_,j_=linear_sum_assignment(cr); wsh=cr[i_,j_].max()
    R_.ok['_rounding']=0
    rp=j['rounding']['float32_pole_shift']
    if rp is None or abs(rp-wsh)>0.05*wsh+1e-9: R_.bad.append(f'float32_pole_shift {rp} want {wsh} (min |pole| {np.min(np.abs(evF)):.1e})')
    # sensor sets
    ss=j['sensor_sets']; seen=set()
    for s in ss:
        key=[k for k in s if k not in('stable',)]
        lost=s.get('lost') or s.get('sensors_lost') or s.get('without')
        if lost is None: R_.bad.append(f'sensor_sets keys {list(s)}'); break
        nmz=[m['sen'][i]['name'] for i in m['used']]
        L2=L.copy()
        for x in lost: L2[:,nmz.index(x)]=0
        e_=np.linalg.eigvals(A-L2@C); s_=stable(e_,disc); seen.add(tuple(sorted(lost)))
        mar=(np.max(np.abs(e_))-1) if disc else np.max(e_.real)
        if s_!=s['stable'] and abs(mar)>1e-7: R_.bad.append(f'sensor_sets {lost}: {s["stable"]} want {s_}, margin {mar}')
    if p<=6 and len(seen)!=2**p-1: R_.bad.append(f'sensor_sets {len(seen)} of {2**p-1}')
    return R_
def loopmats(m,L,Lf,form):
    """closed loop: real plant state, estimator state; broken input j. returns (Acl, controller as system y->u and u_applied->u)"""
    A,B,C,D,K=m['A'],m['B'],m['C'],m['D'],m['K']
    return A,B,C,D,K
def loop_tf(m,L,Lf,form,j):
    """state space of loop j broken at the plant input j, others closed: input v (enters plant AND?), output -u_j.
    Plant: x+ = Ax + B u ; y = Cx+Du. Estimator is told the commanded u (of all inputs)."""
    return None
def loopcheck(R_,j,m,L,Lf,form,st,P):
    lp=j['loop']; A,B,C,D,K=m['A'],m['B'],m['C'],m['D'],m['K']; N=len(A); mm=B.shape[1]; disc,T=m['disc'],m['T']
    cur=form=='current'
    # Design-model plant without unknown states = real plant (unknowns' own states are not excited)
    pi=[i for i in range(N) if m['role'][i]!='unknown']; ui=[i for i in range(N) if m['role'][i]=='unknown']
    Ap,Bp,Cp=A[np.ix_(pi,pi)],B[pi],C[:,pi]; n=len(pi)
    # controller: state xh (prediction). 
    # prediction/cont: u=-K xh ; xh+ = (A-LC) xh + (B-LD) u + L y
    # current: xf = (I-LfC) xh + Lf y - Lf D u ; u=-K xf  -> implicit with D: (I - K Lf D) u = -K(I-LfC)xh - K Lf y
    I=np.eye(N)
    if not cur:
        Ac=A-L@C-(B-L@D)@K; Bc=L; Cc=-K; Dc=np.zeros((mm,len(C)))
    else:
        Mi=np.linalg.inv(np.eye(mm)-K@Lf@D)
        Cu=-Mi@K@(I-Lf@C); Du=-Mi@K@Lf
        # xf=(I-LfC)xh+Lf y-Lf D u; x+=A xf+B u
        Ac=A@(I-Lf@C)+(B-A@Lf@D)@Cu; Bc=A@Lf+(B-A@Lf@D)@Du; Cc=Cu; Dc=Du
    # plant with input v_j (the broken one), other inputs u. y=Cp x + D v
    def openloop(jj):
        # y depends on D v, v = u except jj -> v_in
        E=np.eye(mm); E[jj,jj]=0; e=np.zeros((mm,1)); e[jj]=1
        # u=Cc xc + Dc y; v=E u + e w; y=Cp x + D v
        # y = Cp x + D E (Cc xc + Dc y) + D e w
        Y=np.linalg.inv(np.eye(len(C))-D@E@Dc)
        yx,yc,yw=Y@Cp,Y@D@E@Cc,Y@D@e
        ux,uc,uw=Dc@yx,Cc+Dc@yc,Dc@yw
        Ao=np.block([[Ap+Bp@E@ux,Bp@E@uc],[Bc@yx,Ac+Bc@yc]]); Bo=np.vstack([Bp@E@uw+Bp@e,Bc@yw])
        Co=-np.hstack([ux[jj:jj+1],uc[jj:jj+1]]); Do=-uw[jj:jj+1]
        return Ao,Bo,Co,Do
    def full():
        Y=np.linalg.inv(np.eye(len(C))-D@Dc)
        yx,yc=Y@Cp,Y@D@Cc
        ux,uc=Dc@yx,Cc+Dc@yc
        return np.block([[Ap+Bp@ux,Bp@uc],[Bc@yx,Ac+Bc@yc]]),ux,uc,Y
    Acl,ux,uc,Y=full()
    ecl=np.linalg.eigvals(Acl)
    pp=cpx(lp['poles'])
    # contract: closed loop poles w/o the unknowns' own: eig of [plant + estimator] = 2n - ... real plant n + estimator N
    R_.ok['loop.poles count']=0
    if len(pp)==len(ecl):
        a,b=match(pp,ecl); d=np.max(np.abs(pp[a]-ecl[b])); R_.ok['loop.poles abs']=d
        if d>1e-4*max(1,np.max(np.abs(ecl))): R_.bad.append(f'loop.poles differ {d:.1e}')
    else: R_.bad.append(f'loop.poles count {len(pp)} want {len(ecl)}')
    stab=stable(ecl,disc)
    if not stab:
        for k in('gain_margin_db','phase_margin_deg','delay_margin_s','sensitivity_peak','input_std'):
            v=lp.get(k); 
            if v is not None and any(c in json.dumps(v) for c in '0123456789'): R_.bad.append(f'loop.{k} given though unstable: {v}')
        return
    # margins per input
    GM_lo=[];GM_hi=[];PM=[];DM=[];DS=[]
    for jj in range(mm):
        Ao,Bo,Co,Do=openloop(jj)
        ev_=np.linalg.eigvals(Ao)
        s=np.log(ev_[np.abs(ev_)>1e-6].astype(complex))/T if disc else ev_
        sc=np.abs(s); sc=sc[sc>1e-9]
        hi=math.pi/T if disc else sc.max()*1e3
        ws=[np.geomspace(min(sc.min(),hi)*1e-5,hi,12000)]
        if disc: ws.append(np.linspace(0,hi,12001)[1:])
        for x in s:
            if abs(x.imag)>0 and abs(x.imag)<=hi*(1+1e-12): ws.append(np.clip(abs(x.imag)+ (abs(x.real)+1e-7*abs(x.imag))*np.linspace(-4,4,801),1e-12,hi))
        w=np.unique(np.concatenate(ws))
        def Lw(w_):
            w_=np.atleast_1d(w_); z=np.exp(1j*w_*T) if disc else 1j*w_
            out=np.empty(len(w_),complex)
            for c0 in range(0,len(w_),5000):
                zz=z[c0:c0+5000]
                X=np.linalg.solve(zz[:,None,None]*np.eye(len(Ao))-Ao,np.broadcast_to(Bo.astype(complex),(len(zz),)+Bo.shape))
                out[c0:c0+5000]=(Co@X)[:,0,0]+Do[0,0]
            return out
        Lv=Lw(w)
        # gain margins: real-axis crossings with Re<0, factor k=-1/Re
        ks=[]
        im=Lv.imag; idx=np.where(np.sign(im[:-1])*np.sign(im[1:])<0)[0]
        for k in idx:
            a,b=w[k],w[k+1]; fa=im[k]
            for _ in range(60):
                c=(a+b)/2; fc=Lw(c)[0].imag
                if np.sign(fc)==np.sign(fa): a=c
                else: b=c
            v=Lw((a+b)/2)[0]
            if v.real<0 and abs(v.imag)<1e-3*max(abs(v.real),1): ks.append(-1/v.real)
        # frequency 0 and pi/T
        with np.errstate(all='ignore'):
            for w0 in ([0.0,math.pi/T] if disc else [0.0]):
                z=cmath.exp(1j*w0*T) if disc else 0
                if w0>0: z=-1
                Mz=z*np.eye(len(Ao))-Ao
                if np.linalg.cond(Mz)<1e14:
                    v=(Co@np.linalg.solve(Mz,Bo))[0,0]+Do[0,0]
                    if np.real(v)<0: ks.append(-1/np.real(v))
        # verify destabilising by eigenvalues of closed loop with factor
        def clstab(f):
            A_=Ao-f*Bo@Co/(1+f*Do[0,0])
            e_=np.linalg.eigvals(A_); return (np.max(np.abs(e_))-1) if disc else np.max(e_.real)
        ks=np.array(ks)
        lo=max([k for k in ks if 0<k<1],default=None); hi_=min([k for k in ks if k>1],default=None)
        # refine: is the crossing really destabilising?
        GM_lo.append(20*math.log10(lo) if lo else None); GM_hi.append(20*math.log10(hi_) if hi_ else None)
        # independent eigen sweep check
        # phase
        mag=np.abs(Lv)-1; idx=np.where(np.sign(mag[:-1])*np.sign(mag[1:])<0)[0]; pm=[];dm=[]
        for k in idx:
            a,b=w[k],w[k+1]; fa=mag[k]
            for _ in range(60):
                c=(a+b)/2; fc=abs(Lw(c)[0])-1
                if np.sign(fc)==np.sign(fa): a=c
                else: b=c
            wc=(a+b)/2; v=Lw(wc)[0]; ang=cmath.phase(-v)   # angle from -1
            pm.append(abs(ang)); 
            th=ang%(2*math.pi)    # lag needed: v e^{-j w d} = -1 -> w d = phase(v)+pi = phase(-v) mod 2pi
            dm.append(th/wc)
        PM.append(math.degrees(min(pm)) if pm else None); DM.append(min(dm) if dm else None)
        if disc:
            # whole delays
            kd=0
            while kd<130 and dm:
                d=kd+1
                # w = delayed v: w[k]= v[k-d], v=-Co x - Do w
                nn=len(Ao); Az=np.zeros((nn+d,nn+d)); Az[:nn,:nn]=Ao; Az[:nn,nn+d-1]=Bo[:,0]
                Az[nn,:nn]=-Co[0]; Az[nn,nn+d-1]=-Do[0,0]
                for x in range(1,d): Az[nn+x,nn+x-1]=1
                if d==1: Az[nn,:nn]=-Co[0]; Az[nn,nn]=-Do[0,0]
                if np.max(np.abs(np.linalg.eigvals(Az)))>=1: break
                kd=d
            DS.append(kd if dm and kd<130 else None)
    mn=lambda x,f: f([y for y in x if y is not None]) if any(y is not None for y in x) else None
    R_.cmp('gm below',lp['gain_margin_db'][0],mn(GM_lo,max),1e-4)
    R_.cmp('gm above',lp['gain_margin_db'][1],mn(GM_hi,min),1e-4)
    R_.cmp('phase_margin',lp['phase_margin_deg'],mn(PM,min),1e-5)
    R_.cmp('delay_margin_s',lp['delay_margin_s'],mn(DM,min),1e-5)
    if disc: R_.cmp('delay_margin_samples',lp['delay_margin_samples'],mn(DS,min),0)
    elif lp.get('delay_margin_samples') is not None: R_.bad.append('delay_margin_samples in continuous')
    # sensitivity: matrix, I+Lu
    # full loop broken: L_u(z)= -Ctrl. Note controller told its own u; Lu = K-controller*P ; S=(I+Lu)^-1 as transfer: 
    # disturbance at plant input d: v=u+d; S: d->v
    Yd=np.linalg.inv(np.eye(len(C))-D@Dc)
    yx,yc,yd=Yd@Cp,Yd@D@Cc,Yd@D
    uxx,ucc,ud=Dc@yx,Cc+Dc@yc,Dc@yd
    Acs=np.block([[Ap+Bp@uxx,Bp@ucc],[Bc@yx,Ac+Bc@yc]]); Bcs=np.vstack([Bp@(np.eye(mm)+ud),Bc@yd]); Ccs=np.hstack([uxx,ucc]); Dcs=np.eye(mm)+ud
    s=np.log(ecl[np.abs(ecl)>1e-6].astype(complex))/T if disc else ecl
    sc=np.abs(s); hi=math.pi/T if disc else sc.max()*1e3
    w=[np.geomspace(min(sc.min(),hi)*1e-4,hi,6000),np.zeros(1)]
    if disc: w.append(np.linspace(0,hi,6001))
    for x in s:
        if abs(x.imag)>0 : w.append(np.clip(abs(x.imag)+ (abs(x.real)+1e-9)*np.linspace(-4,4,801),0,hi))
    w=np.unique(np.concatenate(w))
    def Sw(w_):
        z=np.exp(1j*w_*T) if disc else 1j*w_
        o=[]
        for c0 in range(0,len(z),4000):
            zz=z[c0:c0+4000]; X=np.linalg.solve(zz[:,None,None]*np.eye(len(Acs))-Acs,np.broadcast_to(Bcs.astype(complex),(len(zz),)+Bcs.shape))
            o.append(np.linalg.svd(Ccs@X+Dcs,compute_uv=False)[:,0])
        return np.concatenate(o)
    sv=Sw(w); k=int(np.argmax(sv)); a,b=w[max(k-1,0)],w[min(k+1,len(w)-1)]
    for _ in range(5): ww=np.linspace(a,b,41); vv=Sw(ww); kk=int(np.argmax(vv)); a,b=ww[max(kk-1,0)],ww[min(kk+1,40)]
    R_.cmp('sensitivity_peak',lp['sensitivity_peak'],max(vv[kk],sv[k]),1e-5)
    # input std: noise on actuator: all process + sensor noise, unknown states uncancelled? -> compare variants
    iu=lp['input_std']
    vals=[x.get('std') if isinstance(x,dict) else x for x in iu] if isinstance(iu,list) else iu
    # variant a: real plant (no unknown states), process noise of plant only
    def ustd(incl_unknown):
        if incl_unknown:
            pidx=list(range(N)); 
        else: pidx=pi
        A1,B1,C1,W1=A[np.ix_(pidx,pidx)],B[pidx],C[:,pidx],m['W'][np.ix_(pidx,pidx)]
        y1,y2=Y@C1,Y@D@Cc
        u1,u2=Dc@y1,Cc+Dc@y2
        AA=np.block([[A1+B1@u1,B1@u2],[Bc@y1,Ac+Bc@y2]])
        # sensor noise v: y = Y(C x + D Cc xc + v) ; u=Cc xc + Dc y
        Bv=np.vstack([B1@Dc@Y,Bc@Y]); 
        WW=sl.block_diag(W1,np.zeros((N,N)))+Bv@m['R']@Bv.T
        e_=np.linalg.eigvals(AA)
        if not stable(e_,disc,1e-10): return None
        X=lyap(AA,WW,disc); U=np.hstack([u1,u2]); Dv=Dc@Y
        V=U@X@U.T+Dv@m['R']@Dv.T
        return np.sqrt(np.diag(V))
    va=ustd(False); vb=ustd(True)
    # variant c: only sensor noise
    R_.ustd=(vals,va,vb)
    okk=False
    for nm_,v in (('plant noise',va),('with unknowns',vb)):
        if v is not None and vals is not None and None not in vals and np.max(np.abs(np.array(vals)-v)/v)<1e-5: okk=True; R_.ok['input_std '+nm_]=float(np.max(np.abs(np.array(vals)-v)/v))
    R_.want['input_std']=va
    if not okk: R_.bad.append(f'input_std {vals}; want plant-only {va}, with unknown drift {vb}')
def show(r):
    print(('BAD ' if r.bad else 'ok  ')+r.tag)
    for b in r.bad: print('     -',b)
CASES=[('two-inputs.toml',['--poles=-4±3i,-6,-7,-8,-9']),('density.toml',['--poles=-4±3i']),('density.toml',['--poles=-4±3i','--form','current']),
  ('covariances.toml',['--poles=0.3,0.4±0.2i']),('ramp.toml',['--poles=bessel@3']),
  ('sine.toml',['--poles=bessel@3']),('feedthrough.toml',['--poles=0.3,0.4'])]
# Current forms of a singular A are left out: their Lf is not unique, so the gain alone does not fix them.
PATHS={'noise.std':'noise.std','floor_std':'noise.floor_std','sensor_to_state':'noise.sensor_to_state','peak_gain':'noise.peak_gain','settle_s':'transient.settle_s','peak':'transient.peak',
  'phase_margin':'loop.phase_margin_deg','gm above':'loop.gain_margin_db','delay_margin_s':'loop.delay_margin_s','delay_margin_samples':'loop.delay_margin_samples',
  'sensitivity_peak':'loop.sensitivity_peak','input_std':'loop.input_std','gain_norm':'gain_norm'}
if __name__=='__main__':
    out=[]
    for f,a in CASES:
        r=audit(f,a,form='current' if 'current' in a else 'prediction'); show(r)
        gain=json.loads(run(['design',f,*a,'--json'])[1])['gain']
        fig={PATHS[k]:np.array(v).tolist() for k,v in r.want.items() if k in PATHS and v is not None}
        out.append({'plant':f,'form':'current' if 'current' in a else 'prediction','gain':gain,'figures':fig})
    json.dump({'source':'SciPy 1.10, figures.py beside this file','cases':out},open('figures.json','w'),indent=1)
