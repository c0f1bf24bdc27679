CREATE TABLE "rig_questions" (
	"lab_id" uuid NOT NULL,
	"id" uuid NOT NULL,
	"question" json NOT NULL,
	"asked_at" timestamp (6) with time zone NOT NULL,
	"taken_by" text,
	"reply" json,
	CONSTRAINT "rig_questions_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
