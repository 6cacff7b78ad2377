(function(){"use strict";
var faults=[];window.addEventListener("error",function(e){faults.push(String(e.message));document.documentElement.dataset.faults=faults.join(" | ");});
document.documentElement.dataset.faults="";
var data=JSON.parse(document.getElementById("data").textContent),r=data.report,s=data.spectrum,dark=matchMedia("(prefers-color-scheme: dark)");
// Colour and dash of a kind: either is enough to tell them apart.
var kinds={"water":["#0072b2","#56b4e9",[]],"oxyanion":["#b34700","#ff9f4d",[8,3]],"metal-oxygen":["#00765a","#2fcf9f",[2,3]],"ammonium":["#8b3d77","#e39ccb",[8,3,2,3]],"lattice":["#6b6100","#e6d84a",[4,4]],"other":["#5f6670","#b4bcc6",[1,5]]};
function css(n){return getComputedStyle(document.documentElement).getPropertyValue(n).trim();}
function colour(k){return kinds[k][dark.matches?1:0];}
function el(tag,text,parent,attrs){var e=document.createElement(tag);if(text!=null)e.textContent=text;for(var a in attrs||{})e.setAttribute(a,attrs[a]);if(parent)parent.appendChild(e);return e;}
function pct(p){return p>0&&p<0.005?"< 1 %":p<1&&p>0.995?"> 99 %":Math.round(100*p)+" %";}
function num(x,d){return Number(x).toFixed(d==null?1:d);}
function kind(l){var f=l.family||"";if(/^[^]*\boh-stretch|hoh-bend|libration/.test(f)){return /xo-stretch|oxo-bend/.test(f)?"oxyanion":/metal-oxygen/.test(f)?"metal-oxygen":/lattice/.test(f)?"lattice":"water";}
 return /xo-stretch|oxo-bend/.test(f)?"oxyanion":/metal-oxygen/.test(f)?"metal-oxygen":/nh-/.test(f)?"ammonium":/lattice/.test(f)?"lattice":"other";}
function table(parent,caption,heads,rows){var w=el("div",null,parent,{"class":"scroll",tabindex:"0",role:"region","aria-label":caption}),t=el("table",null,w);el("caption",caption,t);var h=el("tr",null,el("thead",null,t));heads.forEach(function(x){el("th",x,h,{scope:"col"});});var b=el("tbody",null,t);rows.forEach(function(row){var q=el("tr",null,b);row.forEach(function(x,i){el(i?"td":"th",x,q,i?{}:{scope:"row"});});});return t;}
var main=document.getElementById("main"),assign=data.kind==="assign";
el("h1",(assign?"Assignment of ":"Expected bands of ")+(r.sample||r.table.title||r.table.name),main);
el("p",r.table.formula+" · table "+r.table.name+" ("+r.table.origin+") · up to "+r.quanta+" quanta",main,{"class":"soft"});
if(r.table.caution)el("p",r.table.caution,main,{"class":"caution",role:"note"});
var plotBox=el("div",null,main,{id:"plot",role:"img","aria-label":"Plot over wavenumber; the tables below hold the same numbers"});
var tools=el("p",null,main,{"class":"tools"});
var legend=el("ul",null,main,{"class":"legend"});
var levels=assign?[].concat.apply([],r.bands.map(function(b){return b.candidates;})):r.levels;
var used={};levels.forEach(function(l){used[kind(l)]=1;});
Object.keys(kinds).filter(function(k){return used[k];}).forEach(function(k){var li=el("li",null,legend),v=document.createElementNS("http://www.w3.org/2000/svg","svg");v.setAttribute("width",34);v.setAttribute("height",10);v.setAttribute("aria-hidden","true");var l=document.createElementNS("http://www.w3.org/2000/svg","line");[["x1",0],["x2",34],["y1",5],["y2",5],["stroke",colour(k)],["stroke-width",3],["stroke-dasharray",kinds[k][2].join(" ")]].forEach(function(a){l.setAttribute(a[0],a[1]);});v.appendChild(l);li.appendChild(v);el("span"," "+(k==="water"?"water alone":k==="oxyanion"?"with the oxyanion":k==="metal-oxygen"?"with metal–oxygen":k==="lattice"?"with the lattice":k),li);});
var x,series,log=false,chosen=-1,plot=null;
if(s){x=s.wavenumbers;}else if(assign){var ps=r.bands.map(function(b){return b.observed_cm1;}),a=Math.min.apply(null,ps)-200,z=Math.max.apply(null,ps)+200;x=[a,z];}else{x=data.expected.wavenumbers;}
function ys(){if(s)return[s.ordinates,s.continuum];if(assign)return[[0,1]];var f=function(v){return log?Math.log10(Math.max(v,1e-9)):v;};return[data.expected.sharp.map(f),data.expected.blurred.map(f)];}
function draw(u){var c=u.ctx,b=u.bbox,d=devicePixelRatio||1;c.save();c.beginPath();c.rect(b.left,b.top,b.width,b.height);c.clip();
 var top=Math.max.apply(null,levels.map(function(l){return l.strength_log10;}));
 (assign&&chosen>=0?r.bands[chosen].candidates:levels).forEach(function(l){var k=kind(l),p=u.valToPos(l.position_cm1,"x",true),w=Math.abs(u.valToPos(l.position_cm1+l.sigma_cm1,"x",true)-p),h=assign?Math.max(.012,l.probability)*b.height*(s?.6:1):Math.max(.03,1+(l.strength_log10-top)/5)*b.height*.3;
  c.fillStyle=c.strokeStyle=colour(k);c.globalAlpha=.07;c.fillRect(p-w,b.top+b.height-h,2*w,h);c.globalAlpha=.9;c.lineWidth=1.5*d;c.setLineDash(kinds[k][2].map(function(q){return q*d;}));c.beginPath();c.moveTo(p,b.top+b.height);c.lineTo(p,b.top+b.height-h);c.stroke();});
 c.setLineDash([]);c.globalAlpha=1;if(assign)r.bands.forEach(function(o,i){var p=u.valToPos(o.observed_cm1,"x",true);c.fillStyle=c.strokeStyle=i===chosen?css("--sel"):css("--ink");c.beginPath();c.moveTo(p,b.top+14*d);c.lineTo(p-6*d,b.top+2*d);c.lineTo(p+6*d,b.top+2*d);c.fill();c.lineWidth=(i===chosen?2:1)*d;c.globalAlpha=.6;c.beginPath();c.moveTo(p,b.top+14*d);c.lineTo(p,b.top+b.height);c.stroke();c.globalAlpha=1;});c.restore();}
function size(){return{width:Math.max(280,main.clientWidth),height:innerWidth<600?280:400};}
function make(){if(plot)plot.destroy();var ink=css("--ink"),soft=css("--line"),ax={stroke:ink,grid:{stroke:soft,width:.5},ticks:{stroke:soft}},y=ys();
 var ser=[{label:"wavenumber / cm⁻¹"}];if(s){ser.push({label:s.ordinate,stroke:ink,width:1.5},{label:"continuum",stroke:css("--soft"),dash:[6,4],width:1});}else if(assign){ser.push({label:"probability",show:true,stroke:"transparent",points:{show:false}});}else{ser.push({label:"expected",stroke:ink,width:1.5,points:{show:false}},{label:"blurred by position uncertainty",stroke:css("--soft"),fill:css("--line")+"88",width:1,points:{show:false}});}
 var z=size();plot=new uPlot({width:z.width,height:z.height,scales:{x:{time:false},y:assign&&!s?{range:[0,1]}:{}},legend:{show:false},cursor:{drag:{x:true,y:false}},axes:[Object.assign({},ax,{label:"vacuum wavenumber / cm⁻¹"}),Object.assign({},ax,{label:s?s.ordinate:assign?"probability":log?"log₁₀ expected strength":"expected strength",size:64})],series:ser,hooks:{draw:[draw]}},[x].concat(y),plotBox);
 plot.over.addEventListener("click",function(e){if(!assign)return;var q=e.clientX-plot.over.getBoundingClientRect().left,best=-1,near=20;r.bands.forEach(function(b,i){var m=Math.abs(plot.valToPos(b.observed_cm1,"x")-q);if(m<near){near=m;best=i;}});if(best>=0)choose(best);});}
function move(f,g){var c=plot.scales.x,w=c.max-c.min,m=(c.max+c.min)/2+g*w;plot.setScale("x",{min:m-w*f/2,max:m+w*f/2});}
[["Zoom in",.5,0],["Zoom out",2,0],["Lower wavenumbers",1,-.25],["Higher wavenumbers",1,.25]].forEach(function(t){el("button",t[0],tools,{type:"button"}).addEventListener("click",function(){move(t[1],t[2]);});tools.append(" ");});
el("button","Whole range",tools,{type:"button"}).addEventListener("click",function(){plot.setScale("x",{min:x[0],max:x[x.length-1]});});
if(!assign){var lb=el("button","Log scale",tools,{type:"button","aria-pressed":"false"});lb.addEventListener("click",function(){log=!log;lb.setAttribute("aria-pressed",log);make();});}
var buttons=[],details;
function choose(i){chosen=i;buttons.forEach(function(b,j){b.setAttribute("aria-pressed",j===i);});plot.redraw(false);var b=r.bands[i];details.textContent="";
 el("h2","Band "+b.band+" at "+num(b.observed_cm1)+" ± "+num(b.sigma_cm1)+" cm⁻¹ ("+num(b.observed_um,4)+" µm)",details);el("p",b.verdict+": "+b.verdict_reason,details);
 el("p","Chance: "+num(b.chance_matches.expected)+" levels are expected within ± "+num(b.chance_matches.tolerance_cm1)+" cm⁻¹ by accident; weighted by visibility, "+num(b.chance_matches.weighted,2)+". Other origin: "+pct(b.other_origin.probability)+" (foreign "+pct(b.other_origin.foreign)+", unlisted levels "+pct(b.other_origin.unlisted)+").",details);
 table(details,"Families",["Family","Moieties","Probability"],b.families.map(function(f){return[f.family.join(" + "),f.moieties.join(", "),pct(f.probability)];}));
 table(details,"Candidates",["Level","Predicted / cm⁻¹","Offset / cm⁻¹","Probability","Infrared"],b.candidates.map(function(c){return[c.label,num(c.position_cm1)+" ± "+num(c.sigma_cm1),num(c.offset_cm1),pct(c.probability),c.ir];})).id="candidates";
 b.candidates.forEach(function(c){if(!c.factors.length)return;var d=el("details",null,details);el("summary","Why "+c.label,d);var u=el("ul",null,d);c.factors.forEach(function(f){el("li",f.reason+" (odds × 10^"+num(f.log10,2)+")",u);});});}
if(assign){el("h2","Observed bands",main);var list=el("div",null,main,{"class":"bands",role:"group","aria-label":"Observed bands"});r.bands.forEach(function(b,i){var q=el("button",b.band+" · "+num(b.observed_cm1,0)+" · "+b.verdict,list,{type:"button","aria-pressed":"false"});q.addEventListener("click",function(){choose(i);});buttons.push(q);});details=el("section",null,main,{id:"details","aria-live":"polite"});
 el("h2","Modes",main);table(main,"What the assignment moved (* by more than two standard uncertainties)",["Mode","Before / cm⁻¹","After / cm⁻¹",""],r.updated_modes.map(function(m){return[m.mode,num(m.before_cm1)+" ± "+num(m.before_sigma_cm1),num(m.after_cm1)+" ± "+num(m.sigma_cm1),m.flagged?"*":""];}));
 if(r.missing.length){el("h2","Expected but not seen",main);table(main,"Missing bands",["Level","Position / cm⁻¹","Would be seen"],r.missing.map(function(m){return[m.label,num(m.position_cm1)+" ± "+num(m.sigma_cm1),pct(m.probability)];}));}
}else{el("h2","Levels",main);table(main,"Levels by position",["Level","Position / cm⁻¹","λ / µm","Strength","Family"],r.levels.map(function(l){return[l.label,num(l.position_cm1)+" ± "+num(l.sigma_cm1),num(l.position_um,4),l.strength_class,l.family];}));}
if(r.notes.length){el("h2","Notes",main);var n=el("ul",null,main);r.notes.forEach(function(t){el("li",t,n);});}
el("p","Source of the table: "+r.table.source+(r.method?". Method: "+r.method:""),main,{"class":"soft"});
make();if(assign&&r.bands.length)choose(0);
addEventListener("resize",function(){plot.setSize(size());});dark.addEventListener("change",make);
})();
