# Cuts the two fonts of the window from the full Inter files beside it; run with fontTools in the folder of those files.
from fontTools.ttLib import TTFont
from fontTools import subset
U="U+0020-007E,U+00A0-017F,U+0192,U+02C6-02DD,U+0370-03FF,U+0400-045F,U+2010-2015,U+2018-201E,U+2020-2022,U+2026,U+2030,U+2032-2033,U+2039-203A,U+2044,U+2070-208E,U+20AC,U+2116,U+2122,U+2126,U+2153-215E,U+2190-2199,U+21A9,U+21BA,U+21BB,U+2200-222B,U+2248,U+2260-2265,U+2318,U+23CE,U+25A0-25CF,U+25E6,U+2713,U+2717,U+2715"
for w in ("Regular","SemiBold"):
    f=TTFont(f"Inter-{w}.otf")
    # tabular figures by default: what the tnum feature would substitute
    m={}
    for fr in f["GSUB"].table.FeatureList.FeatureRecord:
        if fr.FeatureTag=="tnum":
            for li in fr.Feature.LookupListIndex:
                for st in f["GSUB"].table.LookupList.Lookup[li].SubTable:
                    st=getattr(st,"ExtSubTable",st)
                    if hasattr(st,"mapping"): m.update(st.mapping)
    cm=f.getBestCmap()
    ch={u:m[g] for u,g in cm.items() if g in m and (0x30<=u<=0x39 or u in (0x2b,0x2212))}
    for t in f["cmap"].tables:
        for u,g in ch.items():
            if u in t.cmap: t.cmap[u]=g
    o=subset.Options(); o.layout_features=["kern"]; o.hinting=False; o.name_IDs=[0,1,2,3,4,5,6,13,14]; o.desubroutinize=False
    s=subset.Subsetter(o)
    us=set()
    for part in U.split(","):
        a=part[2:].split("-"); us|=set(range(int(a[0],16),int(a[-1],16)+1))
    s.populate(unicodes=us); s.subset(f)
    f.save(f"inter-{w.lower()}.otf")
