package discharge

// Where each formula comes from, as findings show it.
const (
	basisEnergy = "½·C_link·V₁² + ½·C_f·E²; textbook circuit theory"
	basisTime   = "R_b·[C_link·ln(V₁⁄E) + (C_link + C_f)·ln(E⁄V_touch)], no load; 60 V within 5 s or a waiting time on a label as in IEC 60204-1, 6.2.4"
)
