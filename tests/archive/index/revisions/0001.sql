BEGIN TRANSACTION;
CREATE TABLE accession (
	address TEXT NOT NULL, 
	cooldown TEXT NOT NULL, 
	number INTEGER NOT NULL, 
	"key" TEXT NOT NULL, 
	accessioned TEXT NOT NULL, 
	supplements TEXT, 
	sheet_file TEXT NOT NULL, 
	differences TEXT NOT NULL, 
	stillroom TEXT NOT NULL, 
	CONSTRAINT pk_accession PRIMARY KEY (address), 
	CONSTRAINT fk_accession_cooldown FOREIGN KEY(cooldown) REFERENCES cooldown (name), 
	CONSTRAINT fk_accession_key FOREIGN KEY("key") REFERENCES sealed_file ("key"), 
	CONSTRAINT uq_accession_cooldown_number UNIQUE (cooldown, number), 
	CONSTRAINT uq_accession_key UNIQUE ("key")
)
 STRICT

;
INSERT INTO "accession" VALUES('2026-03.a1','2026-03',1,'2026-03/2026-03.a1','2026-12-01T17:11:38.000000Z',NULL,'cooldown.toml','[]','0.1.0');
CREATE TABLE alembic_version (
	version_num VARCHAR(32) NOT NULL, 
	CONSTRAINT alembic_version_pkc PRIMARY KEY (version_num)
);
INSERT INTO "alembic_version" VALUES('0001');
CREATE TABLE channel (
	accession TEXT NOT NULL, 
	sweep TEXT NOT NULL, 
	name TEXT NOT NULL, 
	position INTEGER NOT NULL, 
	quantity TEXT NOT NULL, 
	unit TEXT NOT NULL, 
	ucum TEXT NOT NULL, 
	description TEXT NOT NULL, 
	scale TEXT, 
	thermometer TEXT, 
	calibration TEXT, 
	low REAL, 
	high REAL, 
	missing INTEGER NOT NULL, 
	use INTEGER NOT NULL, 
	digest TEXT NOT NULL, 
	CONSTRAINT pk_channel PRIMARY KEY (accession, sweep, name), 
	CONSTRAINT fk_channel_accession_sweep FOREIGN KEY(accession, sweep) REFERENCES sweep (accession, name)
)
 STRICT

;
INSERT INTO "channel" VALUES('2026-03.a1','s001','time',0,'instant','s','s','',NULL,NULL,NULL,1772524800.0,1772531880.0,0,1,'04c3120ae25c2f5a97e6a62f6731cc001bb34f5b793113a05bbb78c777fe2a66');
INSERT INTO "channel" VALUES('2026-03.a1','s001','temperature',1,'temperature','K','K','','ITS-90',NULL,NULL,0.2,0.79,0,1,'8f1d8f438f588a77be8f565b65319be6b1561c8785245dcc10f8b1ea47622bfd');
INSERT INTO "channel" VALUES('2026-03.a1','s001','period',2,'period','ms','ms','',NULL,NULL,NULL,1.0000002,1.00000079,0,1,'48edf4e6071f97a4a25a6e1df5c77460c990e5689e4216d1d46b5563300e35cc');
INSERT INTO "channel" VALUES('2026-03.a1','s002','time',0,'instant','s','s','',NULL,NULL,NULL,1772956800.0,1772963880.0,0,1,'d0e0bf2a843c7b73c5c0c604c558b1f50bf917b914463400118471e2bec0ff8c');
INSERT INTO "channel" VALUES('2026-03.a1','s002','temperature',1,'temperature','K','K','','ITS-90',NULL,NULL,0.2,0.79,0,1,'8f1d8f438f588a77be8f565b65319be6b1561c8785245dcc10f8b1ea47622bfd');
INSERT INTO "channel" VALUES('2026-03.a1','s002','period',2,'period','ms','ms','',NULL,NULL,NULL,1.0000082,1.00000879,0,1,'834f9f4fecb451e5a7c5d84deeeefae5cdf7c9b4ba8d606b0f0752efc2bc8aee');
CREATE TABLE cooldown (
	name TEXT NOT NULL, 
	newest INTEGER, 
	"begin" TEXT, 
	"end" TEXT, 
	outcome TEXT, 
	purpose TEXT, 
	next_step TEXT, 
	cryostat TEXT, 
	cell TEXT, 
	licence TEXT, 
	CONSTRAINT pk_cooldown PRIMARY KEY (name)
)
 STRICT

;
INSERT INTO "cooldown" VALUES('2026-03',1,'2026-03-02T07:00:00.000000Z','2026-03-20T16:00:00.000000Z','complete','a small run for tests',NULL,'fridge.r1','bob.r1',NULL);
CREATE TABLE dose (
	accession TEXT NOT NULL, 
	name TEXT NOT NULL, 
	position INTEGER NOT NULL, 
	at TEXT NOT NULL, 
	act TEXT NOT NULL, 
	counted INTEGER NOT NULL, 
	amount_mol REAL, 
	amount_uncertainty_mol REAL, 
	running_amount_mol REAL, 
	running_amount_uncertainty_mol REAL, 
	running_coverage_mol_per_m2 REAL, 
	running_coverage_uncertainty_mol_per_m2 REAL, 
	method TEXT NOT NULL, 
	CONSTRAINT pk_dose PRIMARY KEY (accession, name), 
	CONSTRAINT fk_dose_accession FOREIGN KEY(accession) REFERENCES accession (address)
)
 STRICT

;
INSERT INTO "dose" VALUES('2026-03.a1','d01',0,'2026-03-04T08:00:00.000000Z','add',1,4.0e-05,1.00000000000002430694e-07,4.0e-05,1.00000000000002430694e-07,2.5e-05,4.72898310950673850597e-07,'as stated in the notebook');
INSERT INTO "dose" VALUES('2026-03.a1','d02',1,'2026-03-06T08:00:00.000000Z','add',1,8.0e-06,1.00000000000000736628e-07,4.8e-05,1.41421356237311739078e-07,3.0e-05,5.69402098696518782841e-07,'as stated in the notebook');
CREATE TABLE finding (
	"key" TEXT NOT NULL, 
	step INTEGER NOT NULL, 
	position INTEGER NOT NULL, 
	code TEXT NOT NULL, 
	severity TEXT NOT NULL, 
	what TEXT NOT NULL, 
	place TEXT, 
	waived INTEGER NOT NULL, 
	content TEXT NOT NULL, 
	CONSTRAINT pk_finding PRIMARY KEY ("key", step, position), 
	CONSTRAINT fk_finding_key FOREIGN KEY("key") REFERENCES sealed_file ("key")
)
 STRICT

;
INSERT INTO "finding" VALUES('2026-03/2026-03.a1',0,0,'effects-not-stated','note','19 of 19 known effects have no state: vapour in dead volume, desorption in heat capacity, thermal transpiration, hydrostatic head, self-heating, sensor-film offset, amplitude dependence, finite ring time, elasticity of contents and of cell, slip, crossing modes, viscous drag of vapour, drift of the resonance, remounting shift, isotopic content, capillary condensation, gravity rounding, ageing of the thermometer, contamination by frozen air',NULL,0,'{"code":"effects-not-stated","column":null,"expected":null,"field":"effect","file":"cooldown.toml","found":null,"line":1,"place":null,"remedy":"they will be printed as \"not examined\"; say what was done about them in [[effect]]","severity":"note","waived":null,"what":"19 of 19 known effects have no state: vapour in dead volume, desorption in heat capacity, thermal transpiration, hydrostatic head, self-heating, sensor-film offset, amplitude dependence, finite ring time, elasticity of contents and of cell, slip, crossing modes, viscous drag of vapour, drift of the resonance, remounting shift, isotopic content, capillary condensation, gravity rounding, ageing of the thermometer, contamination by frozen air"}');
INSERT INTO "finding" VALUES('2026-03/2026-03.a1',0,1,'origin-not-stated','note','7 value(s) do not say how they are known',NULL,0,'{"code":"origin-not-stated","column":null,"expected":null,"field":null,"file":"cooldown.toml","found":null,"line":1,"place":null,"remedy":"write them as { quantity = \"4.31(6) m^2\", known = \"measured\", source = \"...\" } where it matters","severity":"note","waived":null,"what":"7 value(s) do not say how they are known"}');
INSERT INTO "finding" VALUES('2026-03/2026-03.a1',0,2,'helium3-content','warning','the 3He content of well-helium.r1 is not stated','well-helium.r1',0,'{"code":"helium3-content","column":null,"expected":"an amount fraction","field":"record.sample[1]","file":"cooldown.toml","found":null,"line":40,"place":"well-helium.r1","remedy":"state helium3_fraction: well helium has about 0.2 ppm, purified gas less than 1 ppb; or waive it","severity":"warning","waived":null,"what":"the 3He content of well-helium.r1 is not stated"}');
INSERT INTO "finding" VALUES('2026-03/2026-03.a1',0,3,'annealing-missing','warning','s002 follows d02, and how the film was annealed is not recorded','s002',0,'{"code":"annealing-missing","column":null,"expected":null,"field":"sweep[2].settled","file":"cooldown.toml","found":null,"line":84,"place":"s002","remedy":"write annealing in the dose or settled in the sweep; an uneven film broadens the transition","severity":"warning","waived":null,"what":"s002 follows d02, and how the film was annealed is not recorded"}');
INSERT INTO "finding" VALUES('2026-03/s001@empty-cell.1',0,0,'step-left-out','note','step dissipation-from-amplitude was left out: sweep 2026-03/s001 has no channel of kind amplitude','s001',0,'{"code":"step-left-out","column":null,"expected":null,"field":null,"file":null,"found":null,"line":null,"place":"s001","remedy":null,"severity":"note","waived":null,"what":"step dissipation-from-amplitude was left out: sweep 2026-03/s001 has no channel of kind amplitude"}');
INSERT INTO "finding" VALUES('2026-03/s001@empty-cell.1',0,1,'step-left-out','note','step background-fit was left out: sweep 2026-03/s001 has no channel of kind dissipation; and step dissipation-from-amplitude was left out: sweep 2026-03/s001 has no channel of kind amplitude','s001',0,'{"code":"step-left-out","column":null,"expected":null,"field":null,"file":null,"found":null,"line":null,"place":"s001","remedy":null,"severity":"note","waived":null,"what":"step background-fit was left out: sweep 2026-03/s001 has no channel of kind dissipation; and step dissipation-from-amplitude was left out: sweep 2026-03/s001 has no channel of kind amplitude"}');
INSERT INTO "finding" VALUES('2026-03/s001@empty-cell.1',0,2,'step-left-out','note','step quality-factor-from-dissipation was left out: step background-fit was left out: sweep 2026-03/s001 has no channel of kind dissipation; and step dissipation-from-amplitude was left out: sweep 2026-03/s001 has no channel of kind amplitude','s001',0,'{"code":"step-left-out","column":null,"expected":null,"field":null,"file":null,"found":null,"line":null,"place":"s001","remedy":null,"severity":"note","waived":null,"what":"step quality-factor-from-dissipation was left out: step background-fit was left out: sweep 2026-03/s001 has no channel of kind dissipation; and step dissipation-from-amplitude was left out: sweep 2026-03/s001 has no channel of kind amplitude"}');
CREATE TABLE output (
	reduction TEXT NOT NULL, 
	name TEXT NOT NULL, 
	position INTEGER NOT NULL, 
	headline INTEGER, 
	step INTEGER NOT NULL, 
	quantity TEXT NOT NULL, 
	unit TEXT NOT NULL, 
	ucum TEXT NOT NULL, 
	description TEXT NOT NULL, 
	scale TEXT, 
	rows INTEGER, 
	value REAL, 
	uncertainty REAL, 
	value_si REAL, 
	uncertainty_si REAL, 
	verdict TEXT, 
	digest TEXT NOT NULL, 
	CONSTRAINT pk_output PRIMARY KEY (reduction, name), 
	CONSTRAINT fk_output_reduction FOREIGN KEY(reduction) REFERENCES reduction (address)
)
 STRICT

;
INSERT INTO "output" VALUES('2026-03/s001@empty-cell.1','temperature',0,NULL,1,'temperature','K','K','temperature','ITS-90',60,NULL,NULL,NULL,NULL,NULL,'8f1d8f438f588a77be8f565b65319be6b1561c8785245dcc10f8b1ea47622bfd');
INSERT INTO "output" VALUES('2026-03/s001@empty-cell.1','period_background',1,NULL,2,'period','s','s','Chebyshev coefficients of the background, lowest first',NULL,2,NULL,NULL,NULL,NULL,NULL,'ddbba130469a1146f840ae9c30ae7bd71fedc4c46a55a82770b8fd52db852eff');
INSERT INTO "output" VALUES('2026-03/s001@empty-cell.1','period_low',2,NULL,2,'temperature','K','K','lowest temperature of the background','ITS-90',NULL,0.2,0.0,0.2,0.0,NULL,'ec361add5afbcdb8b62bf8daef0ed186d18714095ea66df0b460266669a7c753');
INSERT INTO "output" VALUES('2026-03/s001@empty-cell.1','period_high',3,NULL,2,'temperature','K','K','highest temperature of the background','ITS-90',NULL,0.79,0.0,0.79,0.0,NULL,'c489c6ca1e7ffa7b7bd5670622ab9e70e9277000ee6f7de9e89e90156001b8a8');
INSERT INTO "output" VALUES('2026-03/s001@empty-cell.1','empty_period',4,0,2,'period','s','s','background at its lowest temperature',NULL,NULL,1.00000020000000030585e-03,5.10009107386805820693e-13,1.00000020000000030585e-03,5.10009107386805820693e-13,NULL,'3a8a7cbdd89b02b581f118ff2dfe9fdeb70e9f8defa5d596340e8ced7dc13939');
CREATE TABLE "plan" (
	address TEXT NOT NULL, 
	digest TEXT NOT NULL, 
	name TEXT NOT NULL, 
	revision INTEGER NOT NULL, 
	title TEXT NOT NULL, 
	content TEXT NOT NULL, 
	CONSTRAINT pk_plan PRIMARY KEY (address, digest)
)
 STRICT

;
INSERT INTO "plan" VALUES('empty-cell.r1','17bd23cdf27bb407e103071bc29b8d361e71b30f6c2f499dfae1071b1f518425','empty-cell',1,'Background of the empty cell','{"applies":{"cell_kinds":["torsional-oscillator"],"doses":null,"empty_cell":true,"gas":null,"has_pores":null,"has_substrate":null,"last":false,"sweep_kinds":["temperature-sweep"]},"changed":null,"description":"Period and dissipation of the empty oscillator against temperature, as polynomials with covariance.","headline":["empty_period","empty_quality_factor"],"name":"empty-cell","needs":{},"revision":1,"step":[{"give":{"temperature":"temperature"},"optional":false,"set":{},"take":{"calibration":"calibration:@thermometer","reading":"channel:@thermometer"},"use":"temperature-from-calibration","version":null},{"give":{"coefficients":"period_background","high":"period_high","low":"period_low","value_at_low":"empty_period"},"optional":false,"set":{},"take":{"temperature":"temperature","values":"channel:@period"},"use":"background-fit","version":null},{"give":{"dissipation":"dissipation_from_amplitude"},"optional":true,"set":{},"take":{"amplitude":"channel:@amplitude","detection":"sheet:detection","drive":"channel:@drive | sheet:sweep.drive","period":"channel:@period","reference_drive":"sheet:detection.reference_drive","reference_period":"sheet:detection.reference_period","reference_quality_factor":"sheet:detection.reference_quality_factor","reference_signal":"sheet:detection.reference_signal"},"use":"dissipation-from-amplitude","version":null},{"give":{"coefficients":"dissipation_background","high":"dissipation_high","low":"dissipation_low","value_at_low":"empty_dissipation"},"optional":true,"set":{},"take":{"temperature":"temperature","values":"channel:@dissipation | dissipation_from_amplitude"},"use":"background-fit","version":null},{"give":{"inverse":"empty_quality_factor"},"optional":true,"set":{},"take":{"values":"empty_dissipation"},"use":"quality-factor-from-dissipation","version":null}],"title":"Background of the empty cell","valid_from":null}');
CREATE TABLE raw_file (
	accession TEXT NOT NULL, 
	name TEXT NOT NULL, 
	sha256 TEXT NOT NULL, 
	size INTEGER NOT NULL, 
	role TEXT NOT NULL, 
	CONSTRAINT pk_raw_file PRIMARY KEY (accession, name), 
	CONSTRAINT fk_raw_file_accession FOREIGN KEY(accession) REFERENCES accession (address)
)
 STRICT

;
INSERT INTO "raw_file" VALUES('2026-03.a1','cooldown.toml','572be2fadd021cf16a8cb747e2d8002da639693ec76565a8b86e81b66248d436',1758,'sheet');
INSERT INTO "raw_file" VALUES('2026-03.a1','empty.csv','37fc05aa40396ca70431c76d46e3108ccf2db3106e6efdc11d50630327813beb',2718,'sweep');
INSERT INTO "raw_file" VALUES('2026-03.a1','film.csv','e0ebc5fc19066f6dbc0dd8af3846cdd0bcf61b3d95de01f4f3637283132d6063',2718,'sweep');
CREATE TABLE record (
	accession TEXT NOT NULL, 
	address TEXT NOT NULL, 
	name TEXT NOT NULL, 
	revision INTEGER NOT NULL, 
	kind TEXT NOT NULL, 
	digest TEXT NOT NULL, 
	content TEXT NOT NULL, 
	CONSTRAINT pk_record PRIMARY KEY (accession, address), 
	CONSTRAINT fk_record_accession FOREIGN KEY(accession) REFERENCES accession (address)
)
 STRICT

;
INSERT INTO "record" VALUES('2026-03.a1','bob.r1','bob',1,'cell','273b654d783dfbf68f997f6c43eacb61a5937a557a4443f578bba6fabd6c4e40','{"changed":null,"closable_volume":null,"closing_valve":null,"description":"","empty_period":{"kind":"period","known":"not stated","text":"1.000000(1) ms","uncertainty":1e-06,"unit":"ms","value":1.0},"empty_quality_factor":null,"free_volume":{"kind":"volume","known":"not stated","text":"2.1(1) cm^3","uncertainty":0.1,"unit":"cm^3","value":2.1},"gap":null,"gyration_radius_squared":null,"inertia":null,"kind":"torsional-oscillator","mass_sensitivity":{"kind":"amount_sensitivity","known":"not stated","text":"168(3) ns/mmol","uncertainty":3.0,"unit":"ns/mmol","value":168.0},"material":null,"mode":null,"name":"bob","rated_pressure":null,"rating_document":null,"relief_device":null,"revision":1,"rim_radius":{"kind":"length","known":"not stated","text":"7.5(1) mm","uncertainty":0.1,"unit":"mm","value":7.5},"rod":null,"rod_material":"Al5056","seal":null,"shape":null,"substrate":"plastic.r1","torsion_constant":null,"valid_from":null}');
INSERT INTO "record" VALUES('2026-03.a1','fridge.r1','fridge',1,'cryostat','1a446602f3ccbb9308de806a70a3761783fef37ed9b4f5c1c8b4a3d0c196201e','{"changed":null,"description":"","frequency_reference":null,"kind":"dilution","name":"fridge","revision":1,"site_contact":null,"valid_from":null}');
INSERT INTO "record" VALUES('2026-03.a1','plastic.r1','plastic',1,'substrate','227b7cde424fdff851c03425671e630e6e35ff3fff6737780c848e4bf04ca077','{"area":{"kind":"area","known":"measured","source":"N2 isotherm","text":"1.60(3) m^2","uncertainty":0.03,"unit":"m^2","value":1.6},"area_method":null,"changed":null,"description":"","form":null,"layer":null,"layer_definition":null,"mass":null,"material":"polyimide film","name":"plastic","outgassing":null,"pore_diameter":null,"porosity":null,"preplating":null,"revision":1,"roughness":null,"specific_area":null,"valid_from":null,"van_der_waals":null,"volume":null}');
INSERT INTO "record" VALUES('2026-03.a1','well-helium.r1','well-helium',1,'sample','ea95650c3a4cf20b480219d4fa382ef88d2d846dee741b79de2cee8113a420df','{"area_per_molecule":null,"changed":null,"description":"","gas_source":"well gas, 0.2 ppm 3He as stated by the supplier","helium3_fraction":null,"isotope":"4He","name":"well-helium","revision":1,"valid_from":null}');
CREATE TABLE reduction (
	address TEXT NOT NULL, 
	"key" TEXT NOT NULL, 
	cooldown TEXT NOT NULL, 
	sweep TEXT NOT NULL, 
	"plan" TEXT NOT NULL, 
	number INTEGER NOT NULL, 
	plan_address TEXT NOT NULL, 
	plan_digest TEXT NOT NULL, 
	supersedes TEXT, 
	"begin" TEXT NOT NULL, 
	"end" TEXT NOT NULL, 
	stillroom TEXT NOT NULL, 
	CONSTRAINT pk_reduction PRIMARY KEY (address), 
	CONSTRAINT fk_reduction_cooldown FOREIGN KEY(cooldown) REFERENCES cooldown (name), 
	CONSTRAINT fk_reduction_key FOREIGN KEY("key") REFERENCES sealed_file ("key"), 
	CONSTRAINT fk_reduction_plan_address_plan_digest FOREIGN KEY(plan_address, plan_digest) REFERENCES "plan" (address, digest), 
	CONSTRAINT uq_reduction_key UNIQUE ("key"), 
	CONSTRAINT uq_reduction_sweep_plan_number UNIQUE (sweep, "plan", number)
)
 STRICT

;
INSERT INTO "reduction" VALUES('2026-03/s001@empty-cell.1','2026-03/s001@empty-cell.1','2026-03','2026-03/s001','empty-cell',1,'empty-cell.r1','17bd23cdf27bb407e103071bc29b8d361e71b30f6c2f499dfae1071b1f518425',NULL,'2026-12-01T17:11:39.000000Z','2026-12-01T17:11:40.000000Z','0.1.0');
CREATE TABLE reduction_input (
	reduction TEXT NOT NULL, 
	position INTEGER NOT NULL, 
	address TEXT NOT NULL, 
	role TEXT NOT NULL, 
	digest TEXT, 
	value REAL, 
	uncertainty REAL, 
	unit TEXT, 
	scale TEXT, 
	CONSTRAINT pk_reduction_input PRIMARY KEY (reduction, position), 
	CONSTRAINT fk_reduction_input_reduction FOREIGN KEY(reduction) REFERENCES reduction (address)
)
 STRICT

;
INSERT INTO "reduction_input" VALUES('2026-03/s001@empty-cell.1',0,'2026-03/s001#temperature','temperature','8f1d8f438f588a77be8f565b65319be6b1561c8785245dcc10f8b1ea47622bfd',NULL,NULL,NULL,NULL);
INSERT INTO "reduction_input" VALUES('2026-03/s001@empty-cell.1',1,'2026-03/s001#period','period','48edf4e6071f97a4a25a6e1df5c77460c990e5689e4216d1d46b5563300e35cc',NULL,NULL,NULL,NULL);
CREATE TABLE sealed_file (
	"key" TEXT NOT NULL, 
	document TEXT NOT NULL, 
	address TEXT NOT NULL, 
	sha256 TEXT NOT NULL, 
	size INTEGER NOT NULL, 
	CONSTRAINT pk_sealed_file PRIMARY KEY ("key"), 
	CONSTRAINT ck_sealed_file_document CHECK (document IN ('accession', 'reduction')), 
	CONSTRAINT uq_sealed_file_address UNIQUE (address)
)
 STRICT

;
INSERT INTO "sealed_file" VALUES('2026-03/2026-03.a1','accession','2026-03.a1','912b4bd0bb32fae94b0941f9ae2ea4f2f014cb281c6c6526fc3a2bfc81882e59',27163);
INSERT INTO "sealed_file" VALUES('2026-03/s001@empty-cell.1','reduction','2026-03/s001@empty-cell.1','8e12c1848ee7c9526d57e82bd1974dc4b9bf1eb8b1fd0eaea38ad79c149e3a17',15667);
CREATE TABLE step (
	reduction TEXT NOT NULL, 
	number INTEGER NOT NULL, 
	name TEXT NOT NULL, 
	version INTEGER NOT NULL, 
	sentence TEXT NOT NULL, 
	parameters TEXT NOT NULL, 
	"begin" TEXT NOT NULL, 
	"end" TEXT NOT NULL, 
	CONSTRAINT pk_step PRIMARY KEY (reduction, number), 
	CONSTRAINT fk_step_reduction FOREIGN KEY(reduction) REFERENCES reduction (address)
)
 STRICT

;
INSERT INTO "step" VALUES('2026-03/s001@empty-cell.1',1,'temperature-from-calibration',1,'Temperatures were taken as recorded.','{}','2026-12-01T17:11:40.000000Z','2026-12-01T17:11:40.000000Z');
INSERT INTO "step" VALUES('2026-03/s001@empty-cell.1',2,'background-fit',1,'The period of the empty cell was measured between 0.2 K and 0.79 K and fitted by a polynomial of order 1 (60 points, rms of the residuals 4.21e-07 ps).','{"highest_order":8,"order":null}','2026-12-01T17:11:40.000000Z','2026-12-01T17:11:40.000000Z');
CREATE TABLE sweep (
	accession TEXT NOT NULL, 
	name TEXT NOT NULL, 
	address TEXT NOT NULL, 
	cooldown TEXT NOT NULL, 
	number INTEGER NOT NULL, 
	kind TEXT NOT NULL, 
	cell TEXT, 
	substrate TEXT, 
	sample TEXT, 
	empty_cell INTEGER NOT NULL, 
	after_dose TEXT, 
	"begin" TEXT, 
	"end" TEXT, 
	direction TEXT NOT NULL, 
	rows INTEGER NOT NULL, 
	amount_mol REAL, 
	coverage_mol_per_m2 REAL, 
	coverage_uncertainty_mol_per_m2 REAL, 
	"temperature_low_K" REAL, 
	"temperature_high_K" REAL, 
	scale TEXT, 
	text TEXT NOT NULL, 
	CONSTRAINT pk_sweep PRIMARY KEY (accession, name), 
	CONSTRAINT fk_sweep_accession FOREIGN KEY(accession) REFERENCES accession (address), 
	CONSTRAINT fk_sweep_cooldown FOREIGN KEY(cooldown) REFERENCES cooldown (name), 
	CONSTRAINT uq_sweep_address_number UNIQUE (address, number)
)
 STRICT

;
INSERT INTO "sweep" VALUES('2026-03.a1','s001','2026-03/s001','2026-03',1,'temperature-sweep','bob.r1','plastic.r1','well-helium.r1',1,NULL,'2026-03-03T08:00:00.000000Z','2026-03-03T09:58:00.000000Z','up',60,0.0,0.0,NULL,0.2,0.79,'ITS-90','2026-03/s001
temperature-sweep
empty.csv
a small run for tests
fridge.r1
graduate student
time
instant
temperature
temperature
period
period
bob.r1
torsional-oscillator
plastic.r1
polyimide film
well-helium.r1
well gas, 0.2 ppm 3he as stated by the supplier
4he');
INSERT INTO "sweep" VALUES('2026-03.a1','s002','2026-03/s002','2026-03',1,'temperature-sweep','bob.r1','plastic.r1','well-helium.r1',0,'d02','2026-03-08T08:00:00.000000Z','2026-03-08T09:58:00.000000Z','up',60,4.8e-05,3.0e-05,5.69402098696518782841e-07,0.2,0.79,'ITS-90','2026-03/s002
temperature-sweep
film.csv
a small run for tests
fridge.r1
graduate student
time
instant
temperature
temperature
period
period
bob.r1
torsional-oscillator
plastic.r1
polyimide film
well-helium.r1
well gas, 0.2 ppm 3he as stated by the supplier
4he');
CREATE TABLE sweep_thermometer (
	accession TEXT NOT NULL, 
	sweep TEXT NOT NULL, 
	position INTEGER NOT NULL, 
	thermometer TEXT NOT NULL, 
	CONSTRAINT pk_sweep_thermometer PRIMARY KEY (accession, sweep, position), 
	CONSTRAINT fk_sweep_thermometer_accession_sweep FOREIGN KEY(accession, sweep) REFERENCES sweep (accession, name)
)
 STRICT

;
CREATE INDEX ix_finding_code ON finding (code);
CREATE INDEX ix_reduction_plan_cooldown ON reduction ("plan", cooldown);
CREATE INDEX ix_reduction_supersedes ON reduction (supersedes);
CREATE INDEX ix_output_name_value_si ON output (name, value_si);
CREATE INDEX ix_raw_file_sha256 ON raw_file (sha256);
CREATE INDEX ix_record_address ON record (address);
CREATE INDEX ix_record_name_revision ON record (name, revision);
CREATE INDEX ix_reduction_input_address ON reduction_input (address);
CREATE INDEX ix_step_name_version ON step (name, version);
CREATE INDEX ix_sweep_cell_begin_coverage_mol_per_m2 ON sweep (cell, "begin", coverage_mol_per_m2);
CREATE INDEX ix_sweep_cell_coverage_mol_per_m2_begin ON sweep (cell, coverage_mol_per_m2, "begin");
CREATE INDEX ix_sweep_cooldown_name ON sweep (cooldown, name);
CREATE INDEX ix_channel_calibration ON channel (calibration);
CREATE INDEX ix_sweep_thermometer_thermometer ON sweep_thermometer (thermometer);
COMMIT;
