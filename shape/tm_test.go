package shape
import ("testing";"time";"math")
func TestTM(t *testing.T){
 s:=time.Now(); b,_:=BSpline(4096,0,0,.1,0,5); t.Log("bs",time.Since(s),b.Count,orthonormality(b))
 s=time.Now(); b,_=TaperedFourier(4096,0,0,.1,0); t.Log("tf",time.Since(s),orthonormality(b))
 s=time.Now(); b,_=Fourier(4096,0,0,.5,0); t.Log("f",time.Since(s))
 s=time.Now(); z,_:=ZeroMean(b); t.Log("zm",time.Since(s)); _=z
 for p:=1;p<=5;p++{ b,_=BSpline(4096,0,0,.5,4096,p); t.Log(p,orthonormality(b))
 b,_=BSpline(1001,0,0,.5,1000,p); t.Log(p,orthonormality(b))}
 s=time.Now(); x:=Gaussian(20000,1,math.Inf(1),2.5); t.Log("g",time.Since(s),len(x))
 s=time.Now(); x=Gaussian(2000,1,1e-6,2.5); t.Log("g",time.Since(s),len(x))
 s=time.Now(); x=Gaussian(200,1,1e-6,.5); t.Log("g",time.Since(s),len(x))
 s=time.Now(); x=Gaussian(20000,1,1e-4,8); t.Log("g",time.Since(s),len(x))
 for _,n:=range []int{112,1000,2000,4096}{ s=time.Now(); y:=make([]float64,n); for i:=range y{y[i]=1}; OutOfBand(y,.1); t.Log("oob",n,time.Since(s))}
}
