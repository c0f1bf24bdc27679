CREATE TABLE "files" (
	"name" text PRIMARY KEY NOT NULL,
	"bytes" bigint NOT NULL,
	"sha256" text NOT NULL,
	"made_at" timestamp (6) with time zone NOT NULL
);
--> statement-breakpoint
CREATE TABLE "import_mappings" (
	"lab_id" uuid NOT NULL,
	"rig_id" uuid NOT NULL,
	"channel_name" text NOT NULL,
	"columns" json NOT NULL,
	"mapping" json NOT NULL,
	"used_at" timestamp (6) with time zone NOT NULL,
	"used_by" text NOT NULL,
	CONSTRAINT "import_mappings_lab_id_rig_id_channel_name_pk" PRIMARY KEY("lab_id","rig_id","channel_name")
);
--> statement-breakpoint
ALTER TABLE "imports" ADD COLUMN "wanted_bytes" bigint;--> statement-breakpoint
ALTER TABLE "imports" ADD COLUMN "changed_at" timestamp (6) with time zone;--> statement-breakpoint
ALTER TABLE "imports" ADD COLUMN "touched_at" timestamp (6) with time zone DEFAULT now() NOT NULL;--> statement-breakpoint
ALTER TABLE "imports" ADD COLUMN "object_name" text;--> statement-breakpoint
ALTER TABLE "import_mappings" ADD CONSTRAINT "import_mappings_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "imports" ADD CONSTRAINT "imports_object_name_files_name_fk" FOREIGN KEY ("object_name") REFERENCES "public"."files"("name") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
CREATE INDEX "imports_unfinished" ON "imports" USING btree ("touched_at") WHERE "imports"."stored_at" is null;