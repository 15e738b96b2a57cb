package pipeline

// Texture says how coarse a soil is: which of a method's two forms applies.
type Texture string

// The textures. Fine: silt and clay; coarse: sand and gravel.
const (
	FineSoil   Texture = "fine"
	CoarseSoil Texture = "coarse"
)

// SoilMethod says by whose formulas conductivities are made from composition.
type SoilMethod string

// The methods: M. S. Kersten (1949) and O. Johansen (1975).
const (
	Kersten  SoilMethod = "kersten"
	Johansen SoilMethod = "johansen"
)

// Layer is a layer of the ground under a surface, as its source states it: by
// its composition or by its thermal properties. Exactly one of Soil and Thermal
// is not nil.
type Layer struct {
	ThicknessM float64 // 0: goes on below; the last layer of a profile only
	Soil       *Soil
	Thermal    *Thermal
	Source     string
}

// Soil is what a layer consists of.
type Soil struct {
	Texture        Texture
	DryDensityKgM3 float64 // mass of the dry soil in a volume of ground
	WaterPctDry    float64 // water and ice, % of the DRY mass
	Method         SoilMethod
	QuartzShare    float64 // of the solids, 0 to 1; Johansen only
}

// Thermal is what conduction of heat needs to know of a ground.
type Thermal struct {
	KThawedWMK  float64 // conductivity, thawed, W/(m K)
	KFrozenWMK  float64 // conductivity, frozen, W/(m K)
	CThawedJM3K float64 // heat capacity of a volume, thawed, J/(m3 K)
	CFrozenJM3K float64 // heat capacity of a volume, frozen, J/(m3 K)
	LatentJM3   float64 // latent heat of the water in a volume, J/m3; 0 for a dry one
}

// ThermalLayer is a layer with its thermal properties.
type ThermalLayer struct {
	ThicknessM float64 // 0: goes on below; the last layer of a profile only
	Thermal
}
