CREATE UNLOGGED TABLE "camera_pictures" (
	"lab_id" uuid NOT NULL,
	"camera_id" uuid NOT NULL,
	"taken_at" timestamp (6) with time zone NOT NULL,
	"u_taken_s" double precision NOT NULL,
	"type" text NOT NULL,
	"bytes" "bytea" NOT NULL,
	CONSTRAINT "camera_pictures_lab_id_camera_id_pk" PRIMARY KEY("lab_id","camera_id")
);
--> statement-breakpoint
CREATE TABLE "cameras" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"rig_id" uuid NOT NULL,
	"name" text NOT NULL,
	"kind" text NOT NULL,
	"address" text,
	"user_name" text,
	"password" text,
	"token_hash" text,
	"made_at" timestamp (6) with time zone NOT NULL,
	"made_by" text NOT NULL,
	"removed_at" timestamp (6) with time zone,
	"removed_by" text,
	"looked_at" timestamp (6) with time zone,
	"status" json,
	CONSTRAINT "cameras_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
CREATE TABLE "frames" (
	"lab_id" uuid NOT NULL,
	"id" uuid DEFAULT gen_random_uuid() NOT NULL,
	"run_id" uuid NOT NULL,
	"camera_id" uuid NOT NULL,
	"camera_name" text NOT NULL,
	"seq" integer NOT NULL,
	"moment" text NOT NULL,
	"at" timestamp (6) with time zone NOT NULL,
	"taken_at" timestamp (6) with time zone,
	"u_taken_s" double precision,
	"type" text,
	"sha256" text,
	"size" integer NOT NULL,
	"bytes" "bytea",
	"note" text,
	CONSTRAINT "frames_lab_id_id_pk" PRIMARY KEY("lab_id","id")
);
--> statement-breakpoint
ALTER TABLE "cameras" ADD CONSTRAINT "cameras_lab_id_rig_id_rigs_lab_id_id_fk" FOREIGN KEY ("lab_id","rig_id") REFERENCES "public"."rigs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "frames" ADD CONSTRAINT "frames_lab_id_run_id_runs_lab_id_id_fk" FOREIGN KEY ("lab_id","run_id") REFERENCES "public"."runs"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
ALTER TABLE "frames" ADD CONSTRAINT "frames_lab_id_camera_id_cameras_lab_id_id_fk" FOREIGN KEY ("lab_id","camera_id") REFERENCES "public"."cameras"("lab_id","id") ON DELETE no action ON UPDATE no action;--> statement-breakpoint
CREATE INDEX "cameras_rig" ON "cameras" USING btree ("lab_id","rig_id");--> statement-breakpoint
CREATE UNIQUE INDEX "cameras_token" ON "cameras" USING btree ("token_hash");--> statement-breakpoint
CREATE UNIQUE INDEX "frames_moment" ON "frames" USING btree ("lab_id","run_id","camera_id","seq","moment");